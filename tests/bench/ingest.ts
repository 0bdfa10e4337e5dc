import { createHash } from 'node:crypto';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { synthesise } from '@/devices/synth/chest';
import { seeded } from '@/devices/synth/noise';
import { recipeOf, usualRecipe } from '@/devices/synth/recipes';
import { encodeWav } from '@/devices/synth/wav';
import { analyseRecording } from '@/lib/acoustics/analyse';
import { DEFAULT_LIMITS } from '@/lib/acoustics/judge';
import type { Kernels } from '@/lib/acoustics/kernels/types';
import { FOUR_COMMANDS, median, ownCpu, type Runner, startRunner } from './commands';
import type { Figure } from './figure';

type Kind = Kernels['kind'];
const KINDS: Kind[] = ['wasm', 'plain'];
const KIND_WORDS: Record<Kind, string> = { wasm: '', plain: ', plain TypeScript' };
const ROUNDS = 9;
const BATCH_FILES = 200;

const CASES = [
  { name: '15 s, 4 kHz', seconds: 15, rate: 4000, warm: 400, times: 20, targets: { wasm: 300, plain: 80 } },
  { name: '60 s, 48 kHz', seconds: 60, rate: 48_000, warm: 25, times: 3, targets: { wasm: 25, plain: 3 } },
];
const BATCH_TARGETS: Record<Kind, number> = { wasm: 50, plain: 10 };

const figure = (name: string, value: number, unit: string, target: number | null = null): Figure => ({
  name: `ingest ${name}`,
  value,
  unit,
  target,
  ok: target === null ? null : value >= target,
});

/** All that ingestion does with a clip's bytes: hash, decode, measure, judge, draw. */
async function ingestFile(file: string, kernels: Kind): Promise<void> {
  const bytes = readFileSync(file);
  createHash('sha256').update(bytes).digest();
  await analyseRecording([bytes], {
    declaredMediaType: 'audio/wav',
    limits: DEFAULT_LIMITS,
    totalBytes: bytes.length,
    kernels,
  });
}

function writeClip(file: string, seed: number, rate: number, seconds: number, clean: boolean): void {
  const name = clean ? 'clean vesicular' : usualRecipe(seeded(seed));
  const recipe = recipeOf(name, seed, rate, seconds);
  writeFileSync(file, encodeWav([synthesise(recipe, seed)], { sampleRateHz: rate, bitDepth: 16 }));
}

/** One file, many rounds: the four commands, then ours in both ways; the median of paired ratios. */
async function oneFile(runner: Runner, folder: string, test: (typeof CASES)[number]): Promise<Figure[]> {
  const file = join(folder, `${test.rate}.wav`);
  writeClip(file, 1, test.rate, test.seconds, true);
  for (const kind of KINDS) for (let i = 0; i < test.warm; i++) await ingestFile(file, kind);
  const theirs = new Map(FOUR_COMMANDS.map(({ name }) => [name, [] as number[]]));
  const sums: number[] = [];
  const ours: Record<Kind, number[]> = { wasm: [], plain: [] };
  for (let round = 0; round < ROUNDS; round++) {
    let sum = 0;
    for (const { name, command, args } of FOUR_COMMANDS) {
      const seconds = await runner.cpuOf(command, args(file), 2);
      theirs.get(name)?.push(seconds);
      sum += seconds;
    }
    sums.push(sum);
    for (const kind of KINDS) ours[kind].push(await ownCpu(() => ingestFile(file, kind), test.times));
  }
  const ratio = (kind: Kind, to: number[]) =>
    median(to.map((seconds, i) => seconds / (ours[kind][i] as number)));
  return [
    ...KINDS.flatMap((kind) => [
      figure(
        `${test.name}${KIND_WORDS[kind]}: four commands / ours, CPU`,
        ratio(kind, sums),
        'times',
        test.targets[kind],
      ),
      figure(`${test.name}${KIND_WORDS[kind]}: ours`, median(ours[kind]) * 1000, 'ms CPU'),
    ]),
    ...FOUR_COMMANDS.map(({ name }) =>
      figure(`${test.name}: ${name} / ours, CPU`, ratio('wasm', theirs.get(name) ?? []), 'times'),
    ),
    ...(await limits(file, test.name, median(ours.wasm))),
  ];
}

/** What hashing and copying the bytes alone take, as a share of ours: nothing that reads a file can be faster. */
async function limits(file: string, name: string, ours: number): Promise<Figure[]> {
  const bytes = readFileSync(file);
  const copy = Buffer.alloc(bytes.length);
  const hash = await ownCpu(async () => void createHash('sha256').update(bytes).digest(), 50);
  const copying = await ownCpu(async () => void bytes.copy(copy), 50);
  return [
    figure(`${name}: share of ours that SHA-256 takes`, (100 * hash) / ours, '%'),
    figure(`${name}: share of ours that copying the bytes once takes`, (100 * copying) / ours, '%'),
  ];
}

/** Two hundred clips of a ward's usual lengths and rates, good and bad, once: file by file, theirs and ours in turn. */
async function batch(runner: Runner, folder: string): Promise<Figure[]> {
  const rates = [4000, 4000, 4000, 8000, 8000, 16_000, 44_100];
  const lengths = [8, 10, 12, 15, 15, 20, 30];
  const sums: Record<Kind | 'theirs', number> = { theirs: 0, wasm: 0, plain: 0 };
  const file = join(folder, 'batch.wav');
  for (let i = 0; i < BATCH_FILES; i++) {
    const rate = rates[i % rates.length] as number;
    writeClip(file, i + 1, rate, lengths[(i * 3) % lengths.length] as number, false);
    for (const { command, args } of FOUR_COMMANDS) sums.theirs += await runner.cpuOf(command, args(file));
    for (const kind of KINDS) sums[kind] += await ownCpu(() => ingestFile(file, kind));
  }
  return KINDS.flatMap((kind) => [
    figure(
      `${BATCH_FILES} mixed files${KIND_WORDS[kind]}: four commands / ours, CPU`,
      sums.theirs / sums[kind],
      'times',
      BATCH_TARGETS[kind],
    ),
    figure(`${BATCH_FILES} mixed files${KIND_WORDS[kind]}: ours`, sums[kind] * 1000, 'ms CPU'),
  ]);
}

/**
 * CPU of our whole analysis, warm, against four general-purpose commands on the same files in one interleaved run.
 * Ratios are what counts: the machine may be shared.
 */
export async function ingest(): Promise<Figure[]> {
  const folder = mkdtempSync(join(tmpdir(), 'bellkeep-bench-'));
  const runner = startRunner();
  try {
    const figures: Figure[] = [];
    for (const test of CASES) figures.push(...(await oneFile(runner, folder, test)));
    figures.push(...(await batch(runner, folder)));
    return figures;
  } finally {
    runner.end();
    rmSync(folder, { recursive: true, force: true });
  }
}
