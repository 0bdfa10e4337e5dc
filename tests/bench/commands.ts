import { fork, spawnSync } from 'node:child_process';
import { once } from 'node:events';
import { readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';

/** What one would script: the same four questions, each with the general-purpose tool that answers it. */
export const FOUR_COMMANDS: { name: string; command: string; args: (file: string) => string[] }[] = [
  { name: 'sox stats', command: 'sox', args: (file) => [file, '-n', 'stats'] },
  {
    name: 'ffmpeg astats',
    command: 'ffmpeg',
    args: (file) => ['-hide_banner', '-loglevel', 'error', '-i', file, '-af', 'astats', '-f', 'null', '-'],
  },
  {
    name: 'ffmpeg showspectrumpic',
    command: 'ffmpeg',
    args: (file) => [
      '-hide_banner',
      '-loglevel',
      'error',
      '-y',
      '-i',
      file,
      '-lavfi',
      'showspectrumpic=s=1024x512',
      `${file}.png`,
    ],
  },
  { name: 'sha256sum', command: 'sha256sum', args: (file) => [file] },
];

/** CPU seconds, user and system, of all child processes that have ended. */
function childSeconds(): number {
  const stat = readFileSync('/proc/self/stat', 'utf8').split(') ')[1]?.split(' ') ?? [];
  // cutime and cstime are fields 16 and 17 of proc(5), in ticks of a hundredth of a second.
  return (Number(stat[13]) + Number(stat[14])) / 100;
}

/**
 * Run a command on a file, `times` times.
 *
 * @returns CPU seconds a run
 * @throws Error when the command fails: a ratio to nothing is no figure
 */
export function cpuOf(command: string, args: string[], times = 1): number {
  const before = childSeconds();
  for (let i = 0; i < times; i++) {
    const { status, error } = spawnSync(command, args, { stdio: 'ignore' });
    if (status !== 0) throw error ?? new Error(`${command} ended with ${status}`);
  }
  return (childSeconds() - before) / times;
}

/** CPU seconds of this process, all threads, for one run of `work`. */
export async function ownCpu(work: () => Promise<void>, times = 1): Promise<number> {
  const before = process.cpuUsage();
  for (let i = 0; i < times; i++) await work();
  const { user, system } = process.cpuUsage(before);
  return (user + system) / 1e6 / times;
}

export const median = (values: number[]): number =>
  [...values].sort((a, b) => a - b)[values.length >> 1] ?? Number.NaN;

export interface Runner {
  /** CPU seconds a run of a command. */
  cpuOf(command: string, args: string[], times?: number): Promise<number>;
  end(): void;
}

/** A process that runs commands for us, so that ours stays as warm as a service is. */
export function startRunner(): Runner {
  const child = fork(fileURLToPath(new URL('./runner.ts', import.meta.url)), {
    execArgv: ['--import', 'tsx'],
  });
  return {
    async cpuOf(command, args, times = 1) {
      child.send({ command, args, times });
      const [answer] = (await once(child, 'message')) as [{ seconds?: number; failed?: string }];
      if (answer.seconds === undefined) throw new Error(answer.failed ?? `${command} did not run`);
      return answer.seconds;
    },
    end: () => child.disconnect(),
  };
}
