import { cpuOf } from './commands';

/**
 * Runs commands for a benchmark, in a process of its own: a process that starts another is slower for a while after,
 * and a service that ingests starts none.
 */
process.on('message', ({ command, args, times }: { command: string; args: string[]; times: number }) => {
  try {
    process.send?.({ seconds: cpuOf(command, args, times) });
  } catch (error) {
    process.send?.({ failed: error instanceof Error ? error.message : String(error) });
  }
});
