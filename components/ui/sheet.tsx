import { useEffect, useId, useRef, useState, type ReactNode, type RefObject } from 'react';
import { View } from 'react-native';
import { IconButton } from './button';
import { Heading } from './text';

interface SheetProps {
  open: boolean;
  title: string;
  onClose: () => void;
  children?: ReactNode;
  /** Stays below the scrolled content: the acts of the sheet. */
  footer?: ReactNode;
  /** A sheet that must be answered has no close button and ignores Escape. */
  mustAnswer?: boolean;
  testID?: string;
}

/**
 * A sheet over the page: from the bottom on a phone, centred on a wide screen. The browser's own modal dialog keeps
 * the focus inside, closes on Escape and gives the focus back; what lies under it keeps its state.
 */
export function Sheet(props: SheetProps) {
  return props.open ? <OpenSheet {...props} /> : null;
}

function OpenSheet({ title, onClose, children, footer, mustAnswer = false, testID }: SheetProps) {
  const id = useId();
  const dialog = useRef<HTMLDialogElement>(null);
  const content = useRef<HTMLDivElement>(null);
  const scrolls = useScrolls(content);

  useEffect(() => {
    const element = dialog.current;
    if (element === null) return;
    if (typeof element.showModal === 'function') element.showModal();
    else element.setAttribute('open', '');
  }, []);

  return (
    <dialog
      ref={dialog}
      aria-labelledby={id}
      data-testid={testID}
      className="ef-dialog ef-rise"
      onCancel={(event) => {
        event.preventDefault();
        if (!mustAnswer) onClose();
      }}
      onClick={(event) => (event.target === event.currentTarget && !mustAnswer ? onClose() : undefined)}
      onKeyDown={(event) => event.stopPropagation()}
    >
      <View className="min-h-0 shrink rounded-t-[20px] border border-line bg-panel wide:rounded-[20px]">
        <View className="flex-row items-center justify-between gap-2 pb-1 pl-5 pr-2 pt-2">
          <Heading level={2} nativeID={id} size={20} className="shrink py-2">
            {title}
          </Heading>
          {mustAnswer ? null : <IconButton icon="close" label="Close" onPress={onClose} testID="sheet-close" />}
        </View>
        <div ref={content} className="ef-scroll min-h-0 shrink overflow-y-auto px-5 pb-5" tabIndex={scrolls ? 0 : -1}>
          <View className="gap-4">{children}</View>
        </div>
        {footer === undefined ? null : <View className="gap-3 border-t border-line px-5 pb-5 pt-4">{footer}</View>}
      </View>
    </dialog>
  );
}

/** Whether an element has more than it shows: only then the keyboard has a use for coming to it. */
function useScrolls(place: RefObject<HTMLElement | null>): boolean {
  const [scrolls, setScrolls] = useState(false);
  useEffect(() => {
    const element = place.current;
    if (element === null || typeof ResizeObserver !== 'function') return undefined;
    const observer = new ResizeObserver(() => setScrolls(element.scrollHeight > element.clientHeight + 1));
    for (const one of [element, element.firstElementChild]) if (one !== null) observer.observe(one);
    return () => observer.disconnect();
  }, [place]);
  return scrolls;
}
