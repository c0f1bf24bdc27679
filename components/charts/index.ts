export { SwingStrip, type SwingStripProps } from './swing-strip';
export { stepsOfLog, stepsOfPlan, laneOf, type StripStep } from './strip-model';
export { nowWindow, wholeWindow, type StripWindow } from './strip-geometry';
