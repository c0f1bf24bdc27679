export * from './labs';
export * from './people';
export * from './rigs';
export * from './protocols';
export * from './runs';
export * from './data';
export * from './work';
export * from './schedules';
