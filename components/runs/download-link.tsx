import { Body, Icon } from '@/components/ui';

interface DownloadLinkProps {
  address: string;
  label: string;
  fileName: string;
  /** A full button instead of a quiet one. */
  framed?: boolean;
  testID?: string;
}

/** A file of the server: the browser's own download, which survives large files and shows its progress. */
export function DownloadLink({ address, label, fileName, framed = false, testID }: DownloadLinkProps) {
  return (
    <a
      href={address}
      download={fileName}
      data-testid={testID ?? 'download'}
      className={`flex min-h-target flex-row items-center justify-center gap-2 rounded-action px-4 no-underline hover:bg-panel2 ${framed ? 'border border-line bg-panel2' : ''}`}
    >
      <Icon name="import" size={20} tone={framed ? 'text' : 'lamp'} />
      <Body strong tone={framed ? 'text' : 'lamp'}>
        {label}
      </Body>
    </a>
  );
}
