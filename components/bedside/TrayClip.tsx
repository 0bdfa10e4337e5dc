'use client';

import Link from 'next/link';
import { TRAY_WORDS } from '@/components/custody/entryWords';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { Button } from '@/components/ui/Button';
import { Time } from '@/components/ui/Time';
import { siteOf } from '@/lib/contract/sites';
import type { EncounterChoice } from './EncounterPicker';
import type { Clip } from './session';
import { bornInWords, nameOf } from './words';

/** An encounter that a clip may belong to, as the API answers it. */
export interface Candidate {
  encounterId: string;
  encounterNumber: string;
  givenName: string;
  familyName: string;
  recordNumber: string;
  birthDate: string | null;
  ward: string | null;
  bed: string | null;
  why: string[];
}

/** A stray clip as the API answers it. */
export interface TrayLine extends Clip {
  ward: string | null;
  scannedIdentifier: string | null;
  why: string | null;
  candidates: Candidate[];
}

const choiceOf = ({ encounterId, encounterNumber, why: _why, ...who }: Candidate): EncounterChoice => ({
  id: encounterId,
  number: encounterNumber,
  ...who,
});

const whyOf = (clip: TrayLine): string =>
  `${TRAY_WORDS[clip.why ?? ''] ?? 'nothing tied it to an encounter'}${
    clip.scannedIdentifier === null ? '' : ` (“${clip.scannedIdentifier}”)`
  }`;

interface Props {
  clip: TrayLine;
  /** File it to this encounter; null: to one that is searched for. */
  onFile: (to: EncounterChoice | null) => void;
}

/** One stray clip: what it is, why it is here, where it may belong. */
export function TrayClip({ clip, onFile }: Props) {
  return (
    <article aria-label={`Clip ${clip.number}`} className="rounded-plate border border-line bg-sheet">
      <header className="flex flex-wrap items-center gap-x-5 gap-y-1 border-b border-line px-4 py-1.5">
        <Link
          href={`/recordings/${clip.number}`}
          className="link-quiet mono inline-flex min-h-11 items-center"
        >
          {clip.number}
        </Link>
        {clip.verdict ? <VerdictMark verdict={clip.verdict} /> : null}
        <PassageStrip stage={clip.stage} stopped={clip.stopped !== null} verdict={clip.verdict} />
        <span>{siteOf(clip.site)?.label ?? 'No site given'}</span>
        <span>
          <span className="mono">{clip.assetTag}</span>
          {clip.ward ? `, ${clip.ward}` : ''}
        </span>
        <span className="text-ink-soft">
          recorded <Time at={clip.recordedAt} mode="minute" className="" />
          {clip.durationSeconds === null ? '' : `, ${clip.durationSeconds.toFixed(1)} s`}
        </span>
      </header>
      <div className="px-4 pt-2.5 pb-3">
        <p className="max-w-line text-ink-soft">In the tray because {whyOf(clip)}.</p>
        {clip.candidates.length > 0 ? (
          <ol aria-label="Where it may belong" className="mt-2">
            {clip.candidates.map((candidate) => (
              <CandidateLine key={candidate.encounterId} candidate={candidate} onFile={onFile} />
            ))}
          </ol>
        ) : (
          <p className="mt-2 max-w-line">Nothing points to an encounter on your wards.</p>
        )}
        <div className="border-t border-line pt-3">
          <Button className="min-h-11" onClick={() => onFile(null)}>
            {clip.candidates.length > 0 ? 'Another encounter…' : 'Find the encounter…'}
          </Button>
        </div>
      </div>
    </article>
  );
}

function CandidateLine({
  candidate,
  onFile,
}: {
  candidate: Candidate;
  onFile: (to: EncounterChoice) => void;
}) {
  const first = candidate.why[0] ?? '';
  return (
    <li className="grid items-center gap-x-4 gap-y-2 border-t border-line py-2 first:border-t-0 min-[641px]:grid-cols-[minmax(0,1fr)_auto]">
      <div className="min-w-0">
        <p className="break-words">
          <b>{nameOf(candidate)}</b>, born {bornInWords(candidate.birthDate)},{' '}
          <span className="mono">{candidate.encounterNumber}</span>
          {candidate.bed ? `, ${candidate.bed}` : ''}
        </p>
        <p className="text-13 text-ink-soft">
          {first.charAt(0).toUpperCase() + first.slice(1)}
          {candidate.why.slice(1).map((why) => `; ${why}`)}.
        </p>
      </div>
      <Button
        className="min-h-11 justify-self-start"
        aria-label={`File ${candidate.encounterNumber}, ${nameOf(candidate)}`}
        onClick={() => onFile(choiceOf(candidate))}
      >
        File here…
      </Button>
    </li>
  );
}
