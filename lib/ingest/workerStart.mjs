// Where the house runs from its TypeScript (tests, commands) the thread learns to read it first.
import { register } from 'tsx/esm/api';

register();
await import('./worker.ts');
