import { createElement, use, type ComponentType } from 'react';

type Screens = typeof import('./screens');

let loaded: Screens | null = null;
let loading: Promise<Screens> | null = null;

/**
 * Everything that only a signed-in person sees comes as one file of its own, so that signing in does not wait for it. One file for all, because
 * the bundler loads whatever two such files share with the very first page. After a failure it is fetched anew.
 */
export function fetchScreens(): Promise<Screens> {
  loading ??= import('./screens').then(
    (screens) => (loaded = screens),
    (error: unknown) => {
      loading = null;
      throw error;
    },
  );
  return loading;
}

/** Drawn at once when the file is there: React holds back what had to wait, even for a moment, for 0.3 s. */
const screen = (name: keyof Screens): ComponentType =>
  function LoadedScreen() {
    return createElement((loaded ?? use(fetchScreens()))[name]);
  };

export const AlarmBar = screen('AlarmBar');
export const AlarmScreen = screen('AlarmScreen');
export const AlarmsScreen = screen('AlarmsScreen');
export const AuditScreen = screen('AuditScreen');
export const CalendarScreen = screen('CalendarScreen');
export const CompareRunsScreen = screen('CompareRunsScreen');
export const DataScreen = screen('DataScreen');
export const DoorScreen = screen('DoorScreen');
export const EditorScreen = screen('EditorScreen');
export const EvaluationScreen = screen('EvaluationScreen');
export const FirstMoveScreen = screen('FirstMoveScreen');
export const ImportScreen = screen('ImportScreen');
export const LabScreen = screen('LabScreen');
export const LinkScreen = screen('LinkScreen');
export const NewProtocolScreen = screen('NewProtocolScreen');
export const ProtocolRevisionsScreen = screen('ProtocolRevisionsScreen');
export const ProtocolsScreen = screen('ProtocolsScreen');
export const ReplayScreen = screen('ReplayScreen');
export const RetentionScreen = screen('RetentionScreen');
export const RigRevisionsScreen = screen('RigRevisionsScreen');
export const RigScreen = screen('RigScreen');
export const RigsScreen = screen('RigsScreen');
export const RunScreen = screen('RunScreen');
export const RunningBar = screen('RunningBar');
export const RunsScreen = screen('RunsScreen');
export const SendPicturesScreen = screen('SendPicturesScreen');
export const SpotScreen = screen('SpotScreen');
export const StartScreen = screen('StartScreen');
export const StationsScreen = screen('StationsScreen');
export const StepLogScreen = screen('StepLogScreen');
