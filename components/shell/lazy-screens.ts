import { lazy } from 'react';

/**
 * Everything that only a signed-in person sees comes as one file of its own, so that signing in does not wait for it. One file for all, because
 * the bundler loads whatever two such files share with the very first page.
 */
export const fetchScreens = () => import('./screens');

const screen = (name: keyof Awaited<ReturnType<typeof fetchScreens>>) => lazy(async () => ({ default: (await fetchScreens())[name] }));

export const DataScreen = screen('DataScreen');
export const EditorScreen = screen('EditorScreen');
export const EvaluationScreen = screen('EvaluationScreen');
export const ImportScreen = screen('ImportScreen');
export const LabScreen = screen('LabScreen');
export const LinkScreen = screen('LinkScreen');
export const NewProtocolScreen = screen('NewProtocolScreen');
export const ProtocolRevisionsScreen = screen('ProtocolRevisionsScreen');
export const ProtocolsScreen = screen('ProtocolsScreen');
export const RigRevisionsScreen = screen('RigRevisionsScreen');
export const RigScreen = screen('RigScreen');
export const RigsScreen = screen('RigsScreen');
export const RunScreen = screen('RunScreen');
export const RunningBar = screen('RunningBar');
export const RunsScreen = screen('RunsScreen');
export const StartScreen = screen('StartScreen');
export const StepLogScreen = screen('StepLogScreen');
