import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { synthesise } from '@/devices/synth/chest';
import { recipeOf } from '@/devices/synth/recipes';
import { encodeWav } from '@/devices/synth/wav';
import { analyseRecording } from '@/lib/acoustics/analyse';
import { DEFAULT_LIMITS } from '@/lib/acoustics/judge';
import type { Figure } from './figure';

const ROUNDS = 7;
/** What one would script: the same four questions, each with the general-purpose tool that answers it. */
const COMMANDS: [string, (file: string) => string[]][] = [
  ['sox', (file) => [file, '-n', 'stats']],
  [
    'ffmpeg',
    (file) => ['-hide_banner', '-loglevel', 'error', '-i', file, '-af', 'astats', '-f', 'null', '-'],
  ],
  [
    'ffmpeg',
    (file) => [
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
  ],
  ['sha256sum', (file) => [file]],
];

const CASES = [
  { name: '15 s, 4 kHz', seconds: 15, rate: 4000, target: 80 },
  { name: '60 s, 48 kHz', seconds: 60, rate: 48_000, target: 3 },
];

/** CPU seconds of finished child processes, user and system together. */
function childCpu(run: () => void): number {
  const read = () => {
    const stat = readFileSync('/proc/self/stat', 'utf8').split(') ')[1]?.split(' ') ?? [];
    // cutime and cstime are fields 16 and 17 of proc(5), in ticks of a hundredth of a second.
    return (Number(stat[13]) + Number(stat[14])) / 100;
  };
  const before = read();
  run();
  return read() - before;
}

const median = (values: number[]): number => [...values].sort((a, b) => a - b)[values.length >> 1] ?? 0;

/**
 * CPU of our whole analysis (hash, decode, measure, judge, peaks, spectrogram) against the four commands on the same
 * file, in turn, warm, as the median of paired ratios.
 */
export async function ingest(): Promise<Figure[]> {
  const folder = mkdtempSync(join(tmpdir(), 'bellkeep-bench-'));
  const figures: Figure[] = [];
  try {
    for (const { name, seconds, rate, target } of CASES) {
      const file = join(folder, `${rate}.wav`);
      writeFileSync(
        file,
        encodeWav([synthesise(recipeOf('clean vesicular', 1, rate, seconds), 1)], {
          sampleRateHz: rate,
          bitDepth: 16,
        }),
      );
      const ours = async () => {
        const bytes = readFileSync(file);
        createHash('sha256').update(bytes).digest();
        await analyseRecording([bytes], { declaredMediaType: 'audio/wav', limits: DEFAULT_LIMITS });
      };
      for (let i = 0; i < 5; i++) await ours();
      const ratios: number[] = [];
      const own: number[] = [];
      for (let round = 0; round < ROUNDS; round++) {
        const theirs = childCpu(() => {
          for (const [command, args] of COMMANDS) spawnSync(command, args(file), { stdio: 'ignore' });
        });
        const before = process.cpuUsage();
        for (let i = 0; i < 3; i++) await ours();
        const used = process.cpuUsage(before);
        const mine = (used.user + used.system) / 3e6;
        own.push(mine * 1000);
        ratios.push(theirs / mine);
      }
      const value = median(ratios);
      figures.push({
        name: `ingest ${name}: four commands / ours, CPU`,
        value,
        unit: 'times',
        target,
        ok: value >= target,
      });
      figures.push({
        name: `ingest ${name}: ours`,
        value: median(own),
        unit: 'ms CPU',
        target: null,
        ok: null,
      });
    }
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
  return figures;
}
