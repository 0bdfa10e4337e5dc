'use client';

import useSWRImmutable from 'swr/immutable';
import { decodePeaks } from '@/lib/acoustics/pictures/peaks';
import { decodeSpectrogram } from '@/lib/acoustics/pictures/spectrogram';
import type { Spectrogram, WaveformPeaks } from '@/lib/acoustics/types';

export interface RecordingPictures {
  peaks: WaveformPeaks | null;
  spectrogram: Spectrogram | null;
  /** Why there is none, in words. */
  problem: string | null;
}

const fetchBytes = async (href: string): Promise<Uint8Array> => {
  const answer = await fetch(href);
  if (!answer.ok) throw new Error(`answered ${answer.status}`);
  return new Uint8Array(await answer.arrayBuffer());
};

/** The two derived pictures of a recording, fetched and read; they never change. null addresses wait. */
export function useRecordingPictures(
  peaksHref: string | null,
  spectrogramHref: string | null,
): RecordingPictures {
  const peaks = useSWRImmutable(peaksHref, async (href) => decodePeaks(await fetchBytes(href)));
  const spectrogram = useSWRImmutable(spectrogramHref, async (href) =>
    decodeSpectrogram(await fetchBytes(href)),
  );
  return {
    peaks: peaks.data ?? null,
    spectrogram: spectrogram.data ?? null,
    problem:
      peaks.error || spectrogram.error
        ? 'The picture could not be fetched. The recording is safe; load the page again.'
        : null,
  };
}
