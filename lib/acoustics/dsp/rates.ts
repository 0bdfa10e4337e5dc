/** Rates at which the probes of one channel listen, as whole divisions one behind the other. */
export interface Rates {
  /** For what lasts a millisecond: 8.8 kHz or above where the file has it. */
  eventsFactor: number;
  eventsHz: number;
  /** For what lives below 2 kHz, out of the one before: 4.4 kHz or above where the file has it. */
  lowFactor: number;
  lowHz: number;
  /** For hum and heart, out of the one before: 640 Hz or above. */
  deepFactor: number;
  deepHz: number;
}

const wholeDivision = (rateHz: number, leastHz: number): number => Math.max(1, Math.floor(rateHz / leastHz));

/** How a file's rate is divided. Engineering choice: each stage keeps what its listeners need, with a short filter. */
export function ratesOf(sampleRateHz: number): Rates {
  const eventsFactor = wholeDivision(sampleRateHz, 8800);
  const eventsHz = sampleRateHz / eventsFactor;
  const lowFactor = wholeDivision(eventsHz, 4400);
  const lowHz = eventsHz / lowFactor;
  const deepFactor = wholeDivision(lowHz, 640);
  return { eventsFactor, eventsHz, lowFactor, lowHz, deepFactor, deepHz: lowHz / deepFactor };
}
