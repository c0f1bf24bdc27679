import { createContext, useCallback, useContext, useEffect, useMemo, useState, type ReactNode } from 'react';
import { View } from 'react-native';
import { Button } from './button';
import { Body } from './text';

interface ToastMessage {
  text: string;
  /** Takes the act back; offered for 10 s. */
  undo?: () => void;
}

interface ToastApi {
  show: (message: ToastMessage) => void;
}

const ToastContext = createContext<ToastApi>({ show: () => undefined });
/** Undo is offered for 10 s; a plain word may go sooner. */
const shownForMs = { undo: 10_000, plain: 4_000 } as const;

/** Says in passing that something was done, with Undo where it can be taken back. */
export const useToast = (): ToastApi => useContext(ToastContext);

/** Holds the one message at the bottom of the page; a newer one takes its place. */
export function ToastProvider({ children }: { children: ReactNode }) {
  const [message, setMessage] = useState<(ToastMessage & { id: number }) | null>(null);
  const show = useCallback((next: ToastMessage) => setMessage((before) => ({ ...next, id: (before?.id ?? 0) + 1 })), []);
  const api = useMemo(() => ({ show }), [show]);

  useEffect(() => {
    if (message === null) return undefined;
    const timer = setTimeout(() => setMessage(null), message.undo === undefined ? shownForMs.plain : shownForMs.undo);
    return () => clearTimeout(timer);
  }, [message]);

  const undo = message?.undo;
  return (
    <ToastContext.Provider value={api}>
      {children}
      <View
        role="status"
        aria-live="polite"
        className="absolute left-0 right-0 top-3 items-center px-4"
        style={{ pointerEvents: 'box-none' }}
      >
        {message === null ? null : (
          <View
            key={message.id}
            className="ef-rise max-w-[560px] flex-row items-center gap-4 rounded-action border border-line bg-panel2 py-1 pl-4 pr-2"
            // A plain word must not keep anybody from the buttons it lies over.
            style={{ pointerEvents: undo === undefined ? 'none' : 'auto' }}
          >
            <Body className="shrink py-2">{message.text}</Body>
            {undo === undefined ? null : (
              <Button
                kind="quiet"
                icon="undo"
                label="Undo"
                onPress={() => {
                  undo();
                  setMessage(null);
                }}
              />
            )}
          </View>
        )}
      </View>
    </ToastContext.Provider>
  );
}
