import { ChannelAnalysis } from './channel';
import { cleanStretch } from './cleanStretch';
import { BLOCK_FRAMES } from './decode/blocks';
import { createDecoder } from './decode/decode';
import type { DecodeResult } from './decode/types';
import { type JudgingFacts, judge, verdictOf } from './judge';
import { giveKernels, takeKernels } from './kernels/kernels';
import type { Kernels } from './kernels/types';
import { PeaksProbe } from './pictures/peaks';
import type {
  AudioBlock,
  AudioFormat,
  Finding,
  JudgingLimits,
  Measures,
  Spectrogram,
  Verdict,
  WaveformPeaks,
} from './types';

export interface RecordingAnalysis {
  decode: DecodeResult;
  measures: Measures | null;
  facts: JudgingFacts;
  findings: Finding[];
  verdict: Verdict;
  peaks: WaveformPeaks | null;
  spectrogram: Spectrogram | null;
}

export interface AnalysisOptions {
  declaredMediaType?: string;
  limits: JudgingLimits;
  totalBytes?: number;
  /** Which implementation of the inner loops; WebAssembly where there is any, unless said otherwise. */
  kernels?: Kernels['kind'];
}

/**
 * Everything there is to say of one clip, in one pass over its bytes and in bounded memory: decode, measure, judge,
 * draw. It does not throw on what the bytes are; it throws when the source of the bytes fails.
 *
 * @param bytes the file in order, in pieces of any size
 */
export async function analyseRecording(
  bytes: AsyncIterable<Uint8Array> | Iterable<Uint8Array>,
  options: AnalysisOptions,
): Promise<RecordingAnalysis> {
  const clip = new ClipAnalysis(options.kernels);
  try {
    const decoder = createDecoder({
      onFormat: (format) => clip.begin(format),
      onBlock: (block) => clip.push(block),
      roomFor: (channel, frames) => clip.roomFor(channel, frames),
      spread16: (bytes, frames, channel, channels, at) => clip.spread16(bytes, frames, channel, channels, at),
      ...(options.declaredMediaType === undefined ? {} : { declaredMediaType: options.declaredMediaType }),
      ...(options.totalBytes === undefined ? {} : { totalBytes: options.totalBytes }),
    });
    for await (const piece of bytes) {
      // Most pushes are done when they return: only those that are not are waited for.
      const done = decoder.push(piece);
      if (done) await done;
    }
    return clip.finish(await decoder.end(), options.limits);
  } finally {
    clip.release();
  }
}

/** The measuring of one clip: one analysis a channel, one waveform for all. */
class ClipAnalysis {
  #format: AudioFormat | null = null;
  #channels: ChannelAnalysis[] = [];
  #peaks: PeaksProbe | null = null;
  #identical = true;
  readonly #kernels: Kernels[] = [];
  readonly #blocks: { room: Float32Array; codes: Int16Array }[] = [];

  constructor(private readonly kind: Kernels['kind'] | undefined) {}

  kernelsOf(channel: number): Kernels {
    const kernels = this.#kernels[channel] ?? takeKernels(this.kind);
    this.#kernels[channel] = kernels;
    return kernels;
  }

  roomFor(channel: number, frames: number): Float32Array {
    const { arena } = this.kernelsOf(channel);
    const room = arena.room(frames);
    this.#blocks[channel] = { room, codes: new Int16Array(0) };
    return room;
  }

  /** Interleaved 16-bit codes to a channel's block, by its kernels; the codes are copied to where those can read them. */
  spread16(bytes: Uint8Array, frames: number, channel: number, channels: number, at: number): void {
    const kernels = this.kernelsOf(channel);
    const block = this.#blocks[channel];
    if (!block) throw new Error('a block is asked for before it is filled');
    const words = frames * channels;
    if (block.codes.length === 0) {
      const own = kernels.arena.bytes(2 * BLOCK_FRAMES * channels);
      block.codes = new Int16Array(own.buffer, own.byteOffset, BLOCK_FRAMES * channels);
    }
    const { codes, room } = block;
    new Uint8Array(codes.buffer, codes.byteOffset, 2 * words).set(bytes.subarray(0, 2 * words));
    kernels.spread16(codes, channel, channels, frames, room.subarray(at, at + frames));
  }

  /** Nothing of the clip is used any more but what `finish` gave. */
  release(): void {
    for (const kernels of this.#kernels) giveKernels(kernels);
    this.#kernels.length = 0;
  }

  begin(format: AudioFormat): void {
    this.#format = format;
    const kernels = Array.from({ length: format.channels }, (_, c) => this.kernelsOf(c));
    this.#channels = kernels.map((own) => new ChannelAnalysis(format, own));
    this.#peaks = new PeaksProbe(kernels, format.sampleRateHz, BLOCK_FRAMES);
  }

  push(block: AudioBlock): void {
    block.forEach((samples, c) => {
      this.#channels[c]?.push(samples);
    });
    this.#peaks?.pushBlock(block);
    if (this.#identical && block.length > 1) this.#identical = sameSamples(block[0], block[1]);
  }

  finish(decode: DecodeResult, limits: JudgingLimits): RecordingAnalysis {
    const format = decode.format ?? this.#format;
    const facts: JudgingFacts = {
      failure: decode.failure,
      reason: decode.reason,
      oddities: format?.oddities ?? [],
      missingFrames: decode.missingFrames,
      typeMatches: decode.typeMatches,
      lossy: format?.lossy ?? false,
      overFullScale: 0,
      distinctCodes: 0,
      identicalChannels: false,
      deadChannels: [],
      mainChannel: 0,
      clippedSpans: [],
    };
    if (!decode.ok || !format) {
      const findings = judge(null, facts, limits);
      return {
        decode,
        measures: null,
        facts,
        findings,
        verdict: verdictOf(findings),
        peaks: null,
        spectrogram: null,
      };
    }
    const { measures, spectrogram } = this.#measure(format, decode, facts, limits);
    const findings = judge(measures, facts, limits);
    measures.cleanStretch = cleanStretch(measures, facts.clippedSpans, findings);
    return {
      decode,
      measures,
      facts,
      findings,
      verdict: verdictOf(findings),
      peaks: this.#peaks?.finish() ?? null,
      spectrogram,
    };
  }

  #measure(
    format: AudioFormat,
    decode: DecodeResult,
    facts: JudgingFacts,
    limits: JudgingLimits,
  ): { measures: Measures; spectrogram: Spectrogram } {
    const durationSeconds = decode.frames / format.sampleRateHz;
    const each = this.#channels.map((channel) =>
      channel.finish(durationSeconds, limits.minimumSecondsForRates),
    );
    // What is heard and drawn of several channels is the louder one.
    const main = each.reduce((best, one) =>
      (one.levels.activeLevelDbfsSine ?? -999) > (best.levels.activeLevelDbfsSine ?? -999) ? one : best,
    );
    facts.overFullScale = Math.max(...each.map((one) => one.rails.overFullScale));
    facts.distinctCodes = Math.max(...each.map((one) => one.rails.distinctCodes));
    facts.mainChannel = each.indexOf(main);
    facts.clippedSpans = main.rails.clippedSpans.map(([from, to]) => [
      from / format.sampleRateHz,
      to / format.sampleRateHz,
    ]);
    facts.identicalChannels = each.length > 1 && this.#identical;
    facts.deadChannels =
      each.length > 1
        ? each.flatMap((one, c) => (one.levels.peakDbfs === null || one.rails.distinctCodes < 4 ? [c] : []))
        : [];
    if (facts.deadChannels.length === each.length) facts.deadChannels = [];
    const { clippedFraction, clippedSamples, clippedLongestRunSamples, flatTop } = main.rails;
    const measures: Measures = {
      sampleRateHz: format.sampleRateHz,
      channels: format.channels,
      bitDepth: format.bitDepth,
      encoding: format.encoding,
      container: format.container,
      frames: decode.frames,
      durationSeconds,
      declaredFrames: decode.declaredFrames,
      ...main.levels,
      clippedFraction,
      clippedSamples,
      clippedLongestRunSamples,
      flatTop,
      dropouts: main.dropouts,
      ...main.spectral,
      ...main.activity,
      spikes: main.spikes,
      cleanStretch: null,
      ...(each.length > 1
        ? {
            perChannel: each.map(({ levels, rails, dropouts }) => ({
              ...levels,
              clippedFraction: rails.clippedFraction,
              clippedSamples: rails.clippedSamples,
              clippedLongestRunSamples: rails.clippedLongestRunSamples,
              flatTop: rails.flatTop,
              dropouts,
            })),
          }
        : {}),
    };
    return { measures, spectrogram: main.spectrogram };
  }
}

function sameSamples(a: Float32Array | undefined, b: Float32Array | undefined): boolean {
  if (!a || !b || a.length !== b.length) return false;
  for (let i = 0; i < a.length; i++) if (a[i] !== b[i]) return false;
  return true;
}
