export { SwingStrip, type SwingStripProps } from './swing-strip';
export { stepsOfLog, stepsOfPlan, standsOf, laneOf, type Lane, type PlannedStep, type StripStep } from './strip-model';
export { nowWindow, wholeWindow, type StripWindow } from './strip-geometry';
export { PlanView } from './plan-view';
export { GScale } from './g-scale';
export { BudgetBars, inputWords } from './budget-bars';
export { FitPlot } from './fit-plot';
export { ReversalPlot } from './reversal-plot';
export type { Series } from './curve';
