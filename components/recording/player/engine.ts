/** What is let through, in Hz; null lets everything through. */
export interface Band {
  lowHz: number;
  highHz: number;
}
export type BandChoice = Band | null;

export interface Playing {
  from: number;
  to: number;
  loop: boolean;
  /** 1, or 0.5 for half as fast and an octave lower. */
  rate: number;
  band: BandChoice;
  /** Factor on the samples. */
  gain: number;
  onEnd: (heard: Heard | null) => void;
}

/** One act of listening, for the custody thread. */
export interface Heard {
  /** The stretch that was played, seconds of the recording. */
  from: number;
  to: number;
  /** How long it was listened to, with repeats. */
  seconds: number;
  band: BandChoice;
  rate: number;
}

/** Quality factors of the two halves of a fourth-order Butterworth filter. */
const BUTTERWORTH = [0.5412, 1.3066] as const;

/** Plays stretches of one buffer through a band. One at a time: a new one ends the one before. */
export class Engine {
  #source: AudioBufferSourceNode | null = null;
  #filters: BiquadFilterNode[] = [];
  #playing: (Playing & { startedAt: number }) | null = null;

  constructor(
    private readonly context: AudioContext,
    private readonly buffer: AudioBuffer,
  ) {}

  async play(wanted: Playing): Promise<void> {
    this.stop();
    await this.context.resume();
    const source = this.context.createBufferSource();
    source.buffer = this.buffer;
    source.playbackRate.value = wanted.rate;
    const gain = this.context.createGain();
    gain.gain.value = wanted.gain;
    this.#filters = wanted.band ? this.#filtersFor(wanted.band, wanted.rate) : [];
    const chain: AudioNode[] = [source, ...this.#filters, gain, this.context.destination];
    chain.reduce((before, after) => before.connect(after));
    source.onended = () => {
      if (this.#source !== source) return;
      const heard = this.#heard();
      this.#source = null;
      this.#playing = null;
      wanted.onEnd(heard);
    };
    if (wanted.loop) {
      source.loop = true;
      source.loopStart = wanted.from;
      source.loopEnd = wanted.to;
      source.start(0, wanted.from);
    } else {
      source.start(0, wanted.from, wanted.to - wanted.from);
    }
    this.#source = source;
    this.#playing = { ...wanted, startedAt: this.context.currentTime };
  }

  /** @returns what was heard since it began; null when nothing played */
  stop(): Heard | null {
    const heard = this.#heard();
    const source = this.#source;
    this.#source = null;
    this.#playing = null;
    source?.stop();
    return heard;
  }

  /** Where in the recording the ear is, seconds; null when nothing plays. */
  position(): number | null {
    if (!this.#playing) return null;
    const { from, to, loop, rate, startedAt } = this.#playing;
    const late = this.context.outputLatency || 0;
    const passed = Math.max(0, this.context.currentTime - startedAt - late) * rate;
    const length = to - from;
    return loop && length > 0 ? from + (passed % length) : Math.min(to, from + passed);
  }

  #heard(): Heard | null {
    if (!this.#playing) return null;
    const { from, to, band, rate, startedAt } = this.#playing;
    return { from, to, seconds: Math.max(0, this.context.currentTime - startedAt), band, rate };
  }

  close(): void {
    this.stop();
    void this.context.close();
  }

  /** At half speed every frequency is halved before it gets here, so the band is too. */
  #filtersFor(band: Band, rate: number): BiquadFilterNode[] {
    const nyquist = this.context.sampleRate / 2;
    const edges: [BiquadFilterType, number][] = [
      ['highpass', band.lowHz],
      ['lowpass', band.highHz],
    ];
    return edges.flatMap(([type, hertz]) =>
      BUTTERWORTH.map((quality) => {
        const filter = this.context.createBiquadFilter();
        filter.type = type;
        filter.frequency.value = Math.min(nyquist, hertz * rate);
        // Web Audio takes the quality of these two in decibels.
        filter.Q.value = 20 * Math.log10(quality);
        return filter;
      }),
    );
  }
}

/** The factor that brings the loudest sample just below full scale; 1 where there is nothing to gain. */
export function loudest(buffer: AudioBuffer): number {
  let peak = 0;
  for (let channel = 0; channel < buffer.numberOfChannels; channel++)
    for (const sample of buffer.getChannelData(channel)) peak = Math.max(peak, Math.abs(sample));
  return peak > 0 ? Math.max(1, 0.89 / peak) : 1;
}
