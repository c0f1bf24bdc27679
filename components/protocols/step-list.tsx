import { useEffect, useRef, type RefObject } from 'react';
import { View } from 'react-native';
import { Empty } from '@/components/ui';
import type { Step } from '@/shared/protocol/document';
import { formatStepPath, type StepPath } from '@/shared/protocol/step-path';
import { useEditor } from './editor-context';
import { rowPaths, samePath } from './editor-reducer';
import { StepRow } from './step-row';

interface Key {
  key: string;
  altKey: boolean;
  ctrlKey: boolean;
  metaKey: boolean;
  preventDefault: () => void;
  stopPropagation: () => void;
}

/** The keyboard of the step list: arrows move the choice, Alt and arrows move the step, Delete, Enter for details. */
function useListKeys(): (event: Key) => void {
  const editor = useEditor();
  const { document, selected, mayWrite } = editor;
  const choose = (row: (at: number, last: number) => number) => {
    const rows = rowPaths(document);
    const last = rows.length - 1;
    const at = rows.findIndex((path) => samePath(path, selected));
    const next = rows[Math.min(last, Math.max(0, row(at, last)))];
    if (next !== undefined) editor.select(next);
  };
  const plain: Record<string, () => void> = {
    ArrowDown: () => choose((at) => at + 1),
    ArrowUp: () => choose((at, last) => (at === -1 ? last : at - 1)),
    Home: () => choose(() => 0),
    End: () => choose((_, last) => last),
    Enter: () => (selected === null ? undefined : editor.openDetails(selected)),
    Escape: () => editor.select(null),
    ...(mayWrite ? { Delete: editor.remove, Backspace: editor.remove } : {}),
  };
  const withAlt: Record<string, () => void> = mayWrite
    ? { ArrowUp: editor.moveUp, ArrowDown: editor.moveDown, ArrowRight: editor.nest, ArrowLeft: editor.unnest }
    : {};
  return (event) => {
    if (event.ctrlKey || event.metaKey) return;
    const act = (event.altKey ? withAlt : plain)[event.key];
    if (act === undefined) return;
    // Before the row sees it: a pressable takes Enter for itself.
    event.preventDefault();
    event.stopPropagation();
    act();
  };
}

/** Whether the focus was last given to something in the element: it stays true when what had it is taken off the page. */
function useFocusWithin(host: RefObject<View | null>): RefObject<boolean> {
  const within = useRef(false);
  useEffect(() => {
    const note = (event: FocusEvent) => {
      within.current = (host.current as unknown as HTMLElement | null)?.contains(event.target as Node) === true;
    };
    window.addEventListener('focusin', note);
    return () => window.removeEventListener('focusin', note);
  }, [host]);
  return within;
}

/** All steps of the draft, repeats with theirs inside. */
export function StepList() {
  const { document, selected } = useEditor();
  const host = useRef<View>(null);
  const hadFocus = useFocusWithin(host);
  const onKeyDownCapture = useListKeys();
  const key = selected?.join('.') ?? '';
  useEffect(() => {
    const list = host.current as unknown as HTMLElement | null;
    const row = key === '' ? null : list?.querySelector<HTMLElement>(`[data-path="${key}"]`);
    if (row == null) return;
    // What was moved, doubled or chosen in the strip must not stay out of sight below the fold.
    row.scrollIntoView?.({ block: 'nearest' });
    const { activeElement, body } = window.document;
    // A moved step is a new element, and the old one takes the focus away with it.
    if (list?.contains(activeElement) === true || (activeElement === body && hadFocus.current)) row.focus();
  }, [key, document, hadFocus]);
  if (document.steps.length === 0) {
    return (
      <Empty title="No step yet" icon="protocols">
        Add the first one. Most protocols begin with home, so that the position is known.
      </Empty>
    );
  }
  return (
    <View ref={host} role="tree" aria-label="Steps" testID="step-list" {...{ onKeyDownCapture }}>
      <Rows steps={document.steps} around={[]} />
    </View>
  );
}

function Rows({ steps, around }: { steps: readonly Step[]; around: StepPath }) {
  const { document, selected } = useEditor();
  const firstRow = around.length === 0 && selected === null;
  return steps.map((step, index) => {
    const path = [...around, index + 1];
    const documentPath = formatStepPath(document, path) ?? '';
    return (
      <View key={`${documentPath} ${index}`} role="none">
        <StepRow step={step} path={path} documentPath={documentPath} tabStop={samePath(path, selected) || (firstRow && index === 0)} />
        {step.kind === 'repeat' && step.steps.length > 0 ? (
          <View role="group" className="ml-5 border-l-2 border-line pl-2">
            <Rows steps={step.steps} around={path} />
          </View>
        ) : null}
      </View>
    );
  });
}
