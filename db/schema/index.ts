export * from './credential';
export * from './custody';
export * from './device';
export * from './identity';
export * from './patient';
export * from './policy';
export * from './recording';
export * from './ward';
