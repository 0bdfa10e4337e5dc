import { gaussian, onePole, withRms } from './noise';

/** What goes wrong between chest and file. Amplitudes are of full scale, times are seconds from the clip's start. */
export interface Faults {
  /** Cut at full scale after this gain. */
  clipGain?: number;
  /** Cut at this level, below full scale. */
  flatTop?: number;
  /** Mains: fundamental and overtones; the k-th overtone has 1/(2k) of the amplitude. */
  hum?: { frequencyHz: number; amplitude: number; harmonics?: number };
  dc?: number;
  dropouts?: { atSeconds: number; seconds: number; kind: 'zero' | 'held' }[];
  /** Rubbing and knocking: bursts of low noise. */
  handling?: { atSeconds: number; seconds: number; amplitude: number }[];
  /** How many one-sample clicks of a bad radio link. */
  spikes?: number;
  /** Sensitivity of the sensor over the clip, dB; the instrument's own noise stays where it is. */
  sensitivityDb?: { from: number; to: number };
  /** The header says this rate while the samples were taken at the recipe's. */
  declaredRateHz?: number;
  /** All samples zero. */
  silence?: boolean;
}

/** Loss of sensitivity, linear in dB over the clip: it takes the chest down and leaves the instrument's noise. */
export function loseSensitivity(out: Float32Array, faults: Faults): void {
  const loss = faults.sensitivityDb;
  if (!loss) return;
  const step = (loss.to - loss.from) / Math.max(1, out.length - 1);
  for (let i = 0; i < out.length; i++) out[i] = (out[i] as number) * 10 ** ((loss.from + step * i) / 20);
}

function addHum(out: Float32Array, hum: NonNullable<Faults['hum']>, rate: number): void {
  for (let i = 0; i < out.length; i++) {
    const angle = (2 * Math.PI * hum.frequencyHz * i) / rate;
    let sum = Math.sin(angle);
    for (let h = 2; h <= (hum.harmonics ?? 1); h++) {
      // An overtone beyond half the rate would fold back to where no mains is.
      if (h * hum.frequencyHz < rate / 2) sum += Math.sin(h * angle) / (2 * h);
    }
    out[i] = (out[i] as number) + hum.amplitude * sum;
  }
}

function addHandling(
  out: Float32Array,
  rub: NonNullable<Faults['handling']>[number],
  rate: number,
  random: () => number,
): void {
  const from = Math.round(rub.atSeconds * rate);
  const length = Math.round(rub.seconds * rate);
  const noise = withRms(onePole(gaussian(length, random), 'low', 60, rate), rub.amplitude);
  for (let i = 0; i < length && from + i < out.length; i++)
    out[from + i] = (out[from + i] as number) + (noise[i] as number) * Math.min(1, i / (rate * 0.005));
}

/** The faults in the order in which a real chain has them: picked up, amplified and cut, then lost on the way. */
export function addFaults(out: Float32Array, faults: Faults, rate: number, random: () => number): void {
  if (faults.hum) addHum(out, faults.hum, rate);
  for (const rub of faults.handling ?? []) addHandling(out, rub, rate, random);
  const cut = faults.flatTop ?? 1;
  const gain = faults.clipGain ?? 1;
  for (let i = 0; i < out.length; i++)
    out[i] = Math.max(-cut, Math.min(cut, (out[i] as number) * gain + (faults.dc ?? 0)));
  for (let s = 0; s < (faults.spikes ?? 0); s++)
    out[Math.floor(random() * out.length)] = random() < 0.5 ? 0.9 : -0.9;
  for (const hole of faults.dropouts ?? []) {
    const from = Math.round(hole.atSeconds * rate);
    const to = Math.min(out.length, from + Math.round(hole.seconds * rate));
    out.fill(hole.kind === 'zero' ? 0 : (out[Math.max(0, from - 1)] ?? 0), from, to);
  }
  if (faults.silence) out.fill(0);
}
