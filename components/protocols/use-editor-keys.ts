import { useEffect } from 'react';

interface History {
  undo: (() => void) | null;
  redo: (() => void) | null;
}

const isTyping = (target: EventTarget | null) =>
  target instanceof HTMLElement && (target.isContentEditable || ['INPUT', 'TEXTAREA', 'SELECT'].includes(target.tagName));

/** Ctrl+Z and Ctrl+Shift+Z (or Ctrl+Y; Cmd on a Mac) anywhere on the screen but in a field, which has its own undo. */
export function useHistoryKeys({ undo, redo }: History): void {
  useEffect(() => {
    const onKey = (event: KeyboardEvent) => {
      if (!(event.ctrlKey || event.metaKey) || event.altKey || isTyping(event.target)) return;
      const key = event.key.toLowerCase();
      const act = key === 'z' && !event.shiftKey ? undo : key === 'y' || (key === 'z' && event.shiftKey) ? redo : undefined;
      if (act === undefined) return;
      event.preventDefault();
      act?.();
    };
    window.addEventListener('keydown', onKey);
    return () => window.removeEventListener('keydown', onKey);
  }, [undo, redo]);
}
