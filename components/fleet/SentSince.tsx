import Link from 'next/link';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';

export interface SentClip {
  id: string;
  number: string;
  recordedAt: number;
  receivedAt: number | null;
  verdict: string | null;
  filed: boolean;
}

/** What a device sent since it was last surely in hand. */
export function SentSince({ sinceMs, clips }: { sinceMs: number; clips: readonly SentClip[] }) {
  return (
    <Section title="Sent since it was last surely in hand">
      <p className="mb-2 text-ink-soft">
        Since <Time at={sinceMs} mode="minute" />: {clips.length === 500 ? 'the last 500' : clips.length}{' '}
        {clips.length === 1 ? 'recording' : 'recordings'}. Somebody should look whether each is of the patient
        it is filed to.
      </p>
      <ul className="grid gap-1">
        {clips.map((clip) => (
          <li key={clip.id}>
            <Link className="link mono" href={`/ledger/recordings/${clip.number}`}>
              {clip.number}
            </Link>{' '}
            received <Time at={clip.receivedAt} mode="minute" />, {clip.filed ? 'filed' : 'not filed'}
          </li>
        ))}
      </ul>
    </Section>
  );
}
