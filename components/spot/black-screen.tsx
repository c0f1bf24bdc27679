import { useEffect, useRef } from 'react';
import { formatFixed, NARROW_SPACE } from '@/shared/lib/format-number';
import { positionWords } from './live-panel';
import type { ReaderView } from './spot-reader';

/** Red that leaves dark-adapted eyes and the scale alone, and can just be read at this size (3 : 1 on black). */
const red = '#c00000';

/** The whole screen black but for a few red figures: nothing of it shines on the scale. Any key, or a tap, ends it. */
export function BlackScreen({ view, onClose }: { view: ReaderView; onClose: () => void }) {
  const dialog = useRef<HTMLDialogElement>(null);
  useEffect(() => {
    const element = dialog.current;
    if (element === null) return undefined;
    if (typeof element.showModal === 'function') element.showModal();
    else element.setAttribute('open', '');
    // The browser's own bars are bright as well; where it refuses, F11 does it.
    document.documentElement.requestFullscreen?.().catch(() => undefined);
    return () => {
      if (document.fullscreenElement !== null) void document.exitFullscreen();
    };
  }, []);
  const { sender, figures, warnings } = view;
  const waiting = sender.buffer.held > 1000 ? `, ${sender.buffer.held} wait` : '';
  return (
    <dialog
      ref={dialog}
      aria-label="Black screen"
      data-testid="black-screen"
      onCancel={(event) => {
        event.preventDefault();
        onClose();
      }}
      style={{
        position: 'fixed',
        inset: 0,
        width: '100%',
        height: '100%',
        maxWidth: 'none',
        maxHeight: 'none',
        border: 0,
        padding: 0,
        background: '#000',
      }}
    >
      <button
        type="button"
        aria-label="Show the page again"
        onClick={onClose}
        onKeyDown={onClose}
        style={{
          width: '100%',
          height: '100%',
          border: 0,
          outline: 'none',
          background: '#000',
          color: red,
          cursor: 'none',
          fontSize: 24,
          lineHeight: '34px',
          fontFamily: 'inherit',
        }}
      >
        <div data-testid="black-figures">
          {positionWords(view)}
          {view.sending ? '' : ', not kept'}
        </div>
        <div>
          {formatFixed(figures.rateHz, { decimals: 1 })}
          {NARROW_SPACE}Hz{waiting}
        </div>
        <div>{sender.trouble === null ? '' : 'the server does not store'}</div>
        <div>{warnings.length === 0 ? '' : `${warnings.length} ${warnings.length === 1 ? 'warning' : 'warnings'}`}</div>
      </button>
    </dialog>
  );
}
