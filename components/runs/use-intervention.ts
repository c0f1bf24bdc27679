import { useReducer, useState } from 'react';
import { interventionReducer, type LocalIntervention, type SafeAct } from './intervention';
import { postOfRun, SafeActSender, type RunAddress, type SafePost } from './safe-acts';

export interface SafeActs {
  local: LocalIntervention;
  tap: (act: SafeAct) => void;
}

/** Hold, hold after this dwell and stop. Leaving the screen does not take them back: what was tapped goes on being sent. */
export function useSafeActs(post: SafePost): SafeActs {
  const [local, dispatch] = useReducer(interventionReducer, { kind: 'idle' });
  const [sender] = useState(() => new SafeActSender(dispatch));
  return { local, tap: (act) => sender.tap(act, post) };
}

/** The safe acts of a run. */
export const useIntervention = (run: RunAddress): SafeActs => useSafeActs(postOfRun(run));
