'use client';

import Link from 'next/link';
import { useState } from 'react';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { Caution } from '@/components/recording/Caution';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { RoomBar } from '@/components/shell/BottomBar';
import { concerns } from '@/components/shell/LiveEvents';
import { PatientBar, PlainPage } from '@/components/shell/PatientBar';
import { getJson, sendJson, useData } from '@/components/shell/useData';
import { Button, ButtonLink } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { Time } from '@/components/ui/Time';
import { findingSentence } from '@/lib/acoustics/sentences';
import { SITES, type SiteId, siteOf } from '@/lib/contract/sites';
import { BodyMap, type SiteState } from './BodyMap';
import { LastVerdict } from './LastVerdict';
import type { Clip, Session } from './session';
import { bornInWords, nameOf } from './words';

/** State of each site by its latest clip: done when it can be used or was kept, else to be recorded again. */
export function siteStates(clips: readonly Clip[]): Partial<Record<SiteId, SiteState>> {
  const states: Partial<Record<SiteId, SiteState>> = {};
  for (const clip of clips) {
    const site = siteOf(clip.site)?.id;
    if (!site || states[site] !== undefined || clip.verdict === null) continue;
    states[site] = clip.verdict === 'repeat' && clip.keptAt === null ? 'repeat' : 'done';
  }
  return states;
}

/** A listening session as it is lived: the patient on top, the last verdict large, the body with what is left to do. */
export function SessionView({ first, tray }: { first: Session; tray: number }) {
  const { data, mutate } = useData<Session>(
    `/api/sessions/${first.id}`,
    first,
    (event) =>
      concerns(event, 'session', first.id) ||
      concerns(event, 'encounter', first.encounterId) ||
      concerns(event, 'device', first.deviceId),
  );
  const session = data ?? first;
  const [ending, setEnding] = useState(false);
  const states = siteStates(session.clips);
  const next =
    SITES.find((site) => states[site.id] === 'repeat') ??
    SITES.find((site) => states[site.id] === undefined) ??
    null;
  const latest = session.clips.find((clip) => clip.verdict !== null) ?? null;
  const over = session.closedAt !== null;
  return (
    <>
      <PatientBar
        name={nameOf(session)}
        born={bornInWords(session.birthDate)}
        recordNumber={session.recordNumber}
        action={
          over ? (
            <ButtonLink href="/bedside" variant="bar">
              To Bedside
            </ButtonLink>
          ) : (
            <Button variant="bar" className="min-h-11" onClick={() => setEnding(true)}>
              End session
            </Button>
          )
        }
      />
      <PlainPage>
        <p className="flex flex-wrap justify-between gap-x-4 gap-y-1">
          <span>
            <b>{session.model}</b> <span className="mono text-13 text-ink-soft">{session.assetTag}</span>{' '}
            {over ? (
              <>
                was with this patient until <Time at={session.closedAt} mode="clock" />
              </>
            ) : (
              <>
                is with this patient since <Time at={session.openedAt} mode="clock" />
              </>
            )}
          </span>
          <span className="text-ink-soft">
            {session.lastCheckAt === null ? (
              'no acoustic check yet'
            ) : (
              <>
                Checked <Time at={session.lastCheckAt} mode="date" />, good until{' '}
                <Time at={session.checkDueAt} mode="date" />
              </>
            )}
          </span>
        </p>
        <LastVerdict clip={latest} waiting={!over} onKept={() => void mutate()} />
        <BodyMap states={states} next={over ? null : (next?.id ?? null)} />
        <Clips clips={session.clips} over={over} />
        <Caution />
      </PlainPage>
      <RoomBar
        label="Bedside"
        items={[
          { href: '/bedside', label: 'Bedside' },
          { href: '/bedside/tray', label: 'Tray', count: tray },
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
          await sendJson(`/api/sessions/${session.id}/close`, {}, crypto.randomUUID());
          await mutate(await getJson<Session>(`/api/sessions/${session.id}`));
        }}
      >
        Clips that {session.assetTag} records from now on go to the tray, unless it is opened for another
        patient.
      </ConfirmDialog>
    </>
  );
}

function Clips({ clips, over }: { clips: readonly Clip[]; over: boolean }) {
  if (clips.length === 0) {
    return (
      <p className="rounded-plate border border-line bg-sheet px-4 py-6 text-ink-soft">
        {over
          ? 'Nothing was recorded in this session.'
          : 'No clip yet. It turns up here by itself as soon as the stethoscope has sent it.'}
      </p>
    );
  }
  return (
    <ul aria-label="Clips of this session" className="rounded-plate border border-line bg-sheet">
      {clips.map((clip) => {
        const site = siteOf(clip.site);
        const reason =
          (clip.findings ?? []).find((finding) => finding.severity === 'repeat') ??
          (clip.findings ?? []).find((finding) => finding.severity === 'care');
        return (
          <li key={clip.id} className="border-b border-line last:border-b-0">
            <Link
              href={`/recordings/${clip.number}`}
              className="grid min-h-[52px] grid-cols-[2rem_minmax(0,1fr)_auto] items-center gap-x-3 gap-y-1 px-4 py-2 text-ink no-underline hover:bg-spruce-wash min-[641px]:grid-cols-[2rem_minmax(0,1fr)_11rem_72px_5rem]"
            >
              <b>{site?.number ?? '–'}</b>
              <span className="min-w-0 truncate">
                {site?.label ?? 'no site given'}
                {reason ? (
                  <span className="text-13 text-ink-soft">
                    {' '}
                    · {findingSentence(reason).title.toLowerCase()}
                  </span>
                ) : null}
              </span>
              {clip.verdict ? (
                <VerdictMark verdict={clip.verdict} />
              ) : (
                <span className="text-ink-soft">on its way</span>
              )}
              <PassageStrip stage={clip.stage} stopped={clip.stopped !== null} verdict={clip.verdict} />
              <Time
                at={clip.receivedAt ?? clip.recordedAt}
                ago
                className="text-right text-13 text-ink-soft"
              />
            </Link>
          </li>
        );
      })}
    </ul>
  );
}
