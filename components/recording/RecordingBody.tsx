'use client';

import { useState } from 'react';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { Section } from '@/components/ui/Panel';
import { sideOfPublishedLimits } from '@/lib/acoustics/limits';
import type { Measures } from '@/lib/acoustics/types';
import { FindingsTable, type ShownFinding } from './FindingsTable';
import { figure } from './figures';
import { marksOf, placesWithin } from './marks';
import { Player } from './Player';
import { RecordingStage } from './RecordingStage';
import { usePlayhead } from './usePlayhead';
import { useRecordingPictures } from './useRecordingPictures';

interface Stretch {
  from: number;
  to: number;
}

/** Stage, player and findings of one recording, with what can be said of a selection. */
export function RecordingBody({
  number,
  durationSeconds,
  hasPictures,
  findings,
  measures,
  children,
}: {
  number: string;
  durationSeconds: number;
  hasPictures: boolean;
  findings: readonly ShownFinding[];
  measures: Partial<Measures> | null;
  children?: React.ReactNode;
}) {
  const base = `/api/recordings/${number}`;
  const pictures = useRecordingPictures(
    hasPictures ? `${base}/peaks` : null,
    hasPictures ? `${base}/spectrogram` : null,
  );
  const playhead = usePlayhead();
  const [selection, setSelection] = useState<Stretch | null>(null);
  return (
    <div className="grid min-w-0 gap-5">
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
      />
      {selection ? <SelectionFacts selection={selection} measures={measures} /> : null}
      {children}
      <FindingsTable findings={findings} onSelect={setSelection} />
    </div>
  );
}

function SelectionFacts({ selection, measures }: { selection: Stretch; measures: Partial<Measures> | null }) {
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
