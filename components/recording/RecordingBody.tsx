'use client';

import { type ReactNode, useState } from 'react';
import { sendJson } from '@/components/shell/useData';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { Section } from '@/components/ui/Panel';
import { sideOfPublishedLimits } from '@/lib/acoustics/limits';
import type { Measures } from '@/lib/acoustics/types';
import { FindingsTable, type ShownFinding } from './FindingsTable';
import { figure } from './figures';
import { marksOf, placesWithin } from './marks';
import { type Heard, Player } from './Player';
import { RecordingStage } from './RecordingStage';
import type { Stretch } from './stage/view';
import { usePlayhead } from './usePlayhead';
import { useRecordingPictures } from './useRecordingPictures';

interface Props {
  /** The recording's number. */
  number: string;
  durationSeconds: number;
  /** Hashes of the derived pictures; a recording that could not be read has none. */
  pictures: readonly { kind: string; sha256: string }[];
  findings: readonly ShownFinding[];
  measures: Partial<Measures> | null;
  /** Between the player and the findings. */
  passage: ReactNode;
  /** Under the findings. */
  below: ReactNode;
  /** At the right, under what is said of the selection. */
  beside: ReactNode;
}

/** Stage, player and findings of one recording; at the right what can be said of a selection. */
export function RecordingBody(props: Props) {
  const { number, durationSeconds, findings, measures } = props;
  const base = `/api/recordings/${number}`;
  const hrefOf = (kind: string) => {
    const picture = props.pictures.find((one) => one.kind === kind);
    return picture ? `${base}/${kind}?v=${picture.sha256}` : null;
  };
  const pictures = useRecordingPictures(hrefOf('peaks'), hrefOf('spectrogram'));
  const playhead = usePlayhead();
  const [selection, setSelection] = useState<Stretch | null>(null);
  return (
    <div className="grid gap-x-6 gap-y-8 plate:grid-cols-[minmax(0,1fr)_316px]">
      <div className="grid min-w-0 content-start gap-5">
        {props.pictures.length > 0 ? (
          <>
            <RecordingStage
              label={`Recording ${number}`}
              durationSeconds={durationSeconds}
              {...pictures}
              marks={marksOf(findings, measures)}
              selection={selection}
              onSelect={setSelection}
              playhead={playhead}
            />
            <Player
              href={`${base}/sound`}
              durationSeconds={durationSeconds}
              selection={selection}
              playhead={playhead}
              onHeard={(heard) => void tellHeard(base, heard)}
            />
          </>
        ) : null}
        {props.passage}
        <FindingsTable findings={findings} onSelect={setSelection} />
        {props.below}
      </div>
      <aside className="grid content-start gap-6">
        {props.pictures.length > 0 ? <SelectionFacts selection={selection} measures={measures} /> : null}
        {props.beside}
      </aside>
    </div>
  );
}

/**
 * How it was listened to, for the thread. That it was heard stands there since its bytes were fetched: what is lost
 * here is only the way.
 */
async function tellHeard(base: string, heard: Heard): Promise<void> {
  await sendJson(
    `${base}/heard`,
    { band: heard.band, fromSeconds: heard.from, toSeconds: heard.to, seconds: heard.seconds },
    crypto.randomUUID(),
  ).catch(() => undefined);
}

function SelectionFacts({
  selection,
  measures,
}: {
  selection: Stretch | null;
  measures: Partial<Measures> | null;
}) {
  if (!selection)
    return (
      <Section title="Selection">
        <p className="text-ink-soft">
          None. Drag over the picture, or choose a finding, to measure and play a part.
        </p>
      </Section>
    );
  const { tonal, explosive } = placesWithin(measures, selection);
  const strongest = [...tonal].sort((a, b) => b.prominenceDb - a.prominenceDb)[0];
  return (
    <Section title="Selection">
      <DefinitionList
        facts={[
          { term: 'Length', value: `${figure(selection.to - selection.from, 2)} s` },
          {
            term: 'Strongest tone',
            value: strongest
              ? `${figure(strongest.frequencyHz)} Hz, ${figure(strongest.durationSeconds, 2)} s`
              : 'none measured here',
          },
          { term: 'Published limits', value: strongest ? sideOfPublishedLimits(strongest).join('; ') : null },
          { term: 'Short bursts', value: explosive.length > 0 ? String(explosive.length) : null },
        ]}
      />
    </Section>
  );
}
