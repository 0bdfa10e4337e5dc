'use client';

import { useState } from 'react';
import { Caution } from '@/components/recording/Caution';
import { RoomBar } from '@/components/shell/BottomBar';
import { useLive } from '@/components/shell/LiveEvents';
import { PatientBar, PlainPage } from '@/components/shell/PatientBar';
import { getJson, sendJson, useData } from '@/components/shell/useData';
import { Button, ButtonLink } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { Notice } from '@/components/ui/Notice';
import { SITES, type SiteId, siteOf } from '@/lib/contract/sites';
import { BodyMap } from './BodyMap';
import { LastVerdict } from './LastVerdict';
import { changed } from './live';
import { SessionClips } from './SessionClips';
import { SessionDevice } from './SessionDevice';
import { type Session, siteStates } from './session';
import { bornInWords, nameOf } from './words';

/** A listening session as it is lived: the patient on top, the last verdict large, the body with what is left to do. */
export function SessionView({ first, tray }: { first: Session; tray: number }) {
  const { data, error, mutate } = useData<Session>(`/api/sessions/${first.id}`, first, (event) =>
    changed(
      event,
      { kind: 'session', id: first.id },
      { kind: 'encounter', id: first.encounterId },
      { kind: 'device', id: first.deviceId },
    ),
  );
  const session = data ?? first;
  const waiting = useTray(tray);
  const [ending, setEnding] = useState(false);
  const over = session.closedAt !== null;
  return (
    <>
      <PatientBar
        name={nameOf(session)}
        born={bornInWords(session.birthDate)}
        recordNumber={session.recordNumber}
        action={
          over ? (
            <ButtonLink href={`/encounters/${session.encounterId}`} variant="bar" className="min-h-11">
              To the encounter
            </ButtonLink>
          ) : (
            <Button variant="bar" className="min-h-11" onClick={() => setEnding(true)}>
              End session
            </Button>
          )
        }
      >
        {session.bed ? <span>Bed {session.bed}</span> : null}
      </PatientBar>
      <PlainPage>
        <SessionDevice session={session} />
        {error ? (
          <Notice tone="alarm" title="This page is not up to date" action={<Retry retry={() => mutate()} />}>
            {error.message} Clips are still filed.
          </Notice>
        ) : null}
        <LiveParts session={session} onKept={() => void mutate()} />
        <Caution />
      </PlainPage>
      <RoomBar
        label="Bedside"
        items={[
          { href: '/bedside', label: 'Bedside' },
          { href: '/bedside/tray', label: 'Tray', count: waiting },
          { href: '/bedside/recordings', label: 'Recordings' },
        ]}
      />
      <ConfirmDialog
        open={ending}
        onOpenChange={setEnding}
        title={`End listening session ${session.number}`}
        confirmLabel="End the session"
        danger={false}
        onConfirm={async () => {
          await sendJson(`/api/sessions/${session.id}/close`, {}, `end-${session.id}`);
          await mutate(await getJson<Session>(`/api/sessions/${session.id}`));
        }}
      >
        Clips that {session.assetTag} records from now on go to the tray, unless a session is opened with it.
      </ConfirmDialog>
    </>
  );
}

const Retry = ({ retry }: { retry: () => unknown }) => (
  <Button className="min-h-11" onClick={() => void retry()}>
    Try again
  </Button>
);

/** What changes while one listens. A site that is touched shows its own clips alone. */
function LiveParts({ session, onKept }: { session: Session; onKept: () => void }) {
  const [touched, setTouched] = useState<SiteId | null>(null);
  const over = session.closedAt !== null;
  const states = siteStates(session.clips);
  const next =
    SITES.find((site) => states[site.id] === 'repeat') ??
    SITES.find((site) => states[site.id] === undefined) ??
    null;
  const latest = session.clips.find((clip) => clip.verdict !== null) ?? null;
  const arriving = session.clips.some((clip) => clip.verdict === null && clip.stopped === null);
  const shown = touched ? session.clips.filter((clip) => clip.site === touched) : session.clips;
  return (
    <>
      <LastVerdict clip={latest} over={over} arriving={arriving} onKept={onKept} />
      <BodyMap
        states={states}
        next={over ? null : (next?.id ?? null)}
        selected={touched}
        onSelect={(site) => setTouched((before) => (before === site ? null : site))}
      />
      <div className="grid gap-2">
        {touched ? (
          <p className="flex flex-wrap items-center justify-between gap-3">
            <span>
              Only site {siteOf(touched)?.number}, {siteOf(touched)?.label.toLowerCase()}
            </span>
            <Button className="min-h-11" onClick={() => setTouched(null)}>
              All sites
            </Button>
          </p>
        ) : null}
        <SessionClips
          clips={shown}
          empty={
            touched
              ? 'Nothing was recorded at this site in this session.'
              : over
                ? 'Nothing was recorded in this session.'
                : 'No clip yet. It turns up here by itself as soon as the stethoscope has sent it.'
          }
        />
      </div>
    </>
  );
}

/** How many clips are in the tray, followed live. */
function useTray(first: number): number {
  const { data, mutate } = useData<{ counts: { tray: number } }>(
    '/api/encounters?limit=1',
    undefined,
    undefined,
    {
      revalidateOnMount: false,
    },
  );
  useLive(
    (event) => event.kind === 'put-in-tray' || event.kind === 'filed',
    () => void mutate(),
  );
  return data?.counts.tray ?? first;
}
