'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useState } from 'react';
import { useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Checkbox, FieldSet } from '@/components/ui/Checkbox';
import { EmptyState } from '@/components/ui/EmptyState';
import { Field, Select, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';
import { bornInWords, nameOf } from './words';

interface Choice {
  id: string;
  number: string;
  givenName: string;
  familyName: string;
  birthDate: string | null;
  recordNumber: string;
  ward: string | null;
  bed: string | null;
}
interface DeviceChoice {
  id: string;
  assetTag: string;
  model: string;
  serialNumber: string;
  lastHeardAt: number | null;
  inSession: string | null;
}

/** Patient, stethoscope, open. A scanner types into the stethoscope's field and presses Enter. */
export function NewSession({
  encounters,
  chosen,
  devices,
}: {
  encounters: Choice[];
  chosen: string | null;
  devices: DeviceChoice[];
}) {
  const router = useRouter();
  const [encounterId, setEncounterId] = useState(chosen ?? '');
  const [device, setDevice] = useState('');
  const [takeOver, setTakeOver] = useState(false);
  const { act, busy, failure } = useAct<{ id: string }>('/api/sessions');
  const patient = encounters.find((encounter) => encounter.id === encounterId);
  async function submit(event: FormEvent) {
    event.preventDefault();
    const answer = await act({ encounterId, device, takeOver });
    if (answer) router.push(`/bedside/sessions/${answer.id}`);
  }
  if (encounters.length === 0)
    return (
      <EmptyState title="Nobody is on your wards now">
        Open a patient of another ward from Bedside first.
      </EmptyState>
    );
  return (
    <form onSubmit={submit} className="grid max-w-[640px] gap-5">
      {failure ? (
        <Notice tone={failure.members.takeOver === true ? 'care' : 'alarm'} title={failure.title}>
          {failure.message}
          {failure.members.takeOver === true ? (
            <div className="mt-2">
              <Checkbox
                label="It is here with me now: end that session"
                checked={takeOver}
                onChange={(event) => setTakeOver(event.target.checked)}
              />
            </div>
          ) : null}
        </Notice>
      ) : null}
      <Field label="Patient" required>
        <Select
          value={encounterId}
          onChange={(event) => setEncounterId(event.target.value)}
          placeholder="Choose a patient"
          className="min-h-11"
          options={encounters.map((e) => ({
            value: e.id,
            label: `${e.familyName}, ${e.givenName} · ${bornInWords(e.birthDate)} · ${e.recordNumber}${e.bed ? ` · ${e.bed}` : ''}`,
          }))}
        />
      </Field>
      {patient ? (
        <Notice tone="info" title={`Is this ${nameOf(patient)}?`}>
          Ask for two identifiers before you begin. Born {bornInWords(patient.birthDate)}, record{' '}
          <span className="mono">{patient.recordNumber}</span>, encounter{' '}
          <span className="mono">{patient.number}</span>.
        </Notice>
      ) : null}
      <Field label="Stethoscope" help="Scan its label, or type the asset tag or serial number." required>
        <TextInput
          value={device}
          onChange={(event) => setDevice(event.target.value)}
          mono
          autoComplete="off"
          className="min-h-11"
        />
      </Field>
      {devices.length > 0 ? (
        <FieldSet legend="Or one of your wards">
          <div className="grid gap-1 min-[641px]:grid-cols-2">
            {devices.map((one) => (
              <div key={one.id} className="flex min-h-11 flex-wrap items-center gap-x-2">
                <Checkbox
                  radio
                  name="device"
                  label={
                    <>
                      <span className="mono">{one.assetTag}</span> {one.model}
                    </>
                  }
                  checked={device === one.assetTag}
                  onChange={() => setDevice(one.assetTag)}
                />
                <span className="text-13 text-ink-soft">
                  {one.inSession ? (
                    `in ${one.inSession}`
                  ) : (
                    <>
                      heard <Time at={one.lastHeardAt} ago />
                    </>
                  )}
                </span>
              </div>
            ))}
          </div>
        </FieldSet>
      ) : null}
      <div>
        <Button
          type="submit"
          variant="primary"
          size="large"
          busy={busy}
          disabled={encounterId === '' || device === ''}
        >
          Open the session
        </Button>
      </div>
    </form>
  );
}
