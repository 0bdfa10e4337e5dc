'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useState } from 'react';
import { useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Checkbox } from '@/components/ui/Checkbox';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';
import { type DeviceChoice, DevicePicker } from './DevicePicker';
import { type EncounterChoice, EncounterPicker } from './EncounterPicker';
import { bornInWords, nameOf } from './words';

interface Props {
  encounters: readonly EncounterChoice[];
  chosen: EncounterChoice | null;
  devices: readonly DeviceChoice[];
}

/** Patient, stethoscope, open. A scanner types into the stethoscope's field and presses Enter. */
export function NewSession({ encounters, chosen, devices }: Props) {
  const router = useRouter();
  const [patient, setPatient] = useState(chosen);
  const [device, setDevice] = useState('');
  const [takeOver, setTakeOver] = useState(false);
  const { act, busy, failure } = useAct<{ id: string }>('/api/sessions');
  const [tried, setTried] = useState('');
  // A refusal speaks of the device that was tried, not of the one that is chosen since.
  const refusal = tried === device ? failure : null;
  const elsewhere = refusal?.members.takeOver === true;
  async function submit(event: FormEvent) {
    event.preventDefault();
    if (!patient) return;
    setTried(device);
    const answer = await act({ encounterId: patient.id, device: device.trim(), takeOver });
    if (answer) router.push(`/bedside/sessions/${answer.id}`);
  }
  return (
    <form onSubmit={submit} className="grid max-w-[720px] gap-6">
      <EncounterPicker chosen={patient} onChoose={setPatient} first={encounters} />
      {patient ? (
        <Notice tone="info" title={`Is this ${nameOf(patient)}?`}>
          Ask for two identifiers before you begin: born {bornInWords(patient.birthDate)}, record{' '}
          <span className="mono">{patient.recordNumber}</span>.
        </Notice>
      ) : null}
      <DevicePicker
        word={device}
        own={devices}
        onWord={(word) => {
          setDevice(word);
          setTakeOver(false);
        }}
      />
      {refusal ? (
        <Notice tone={elsewhere ? 'care' : 'alarm'} title={refusal.title} live>
          <p>{refusal.message}</p>
          {elsewhere ? (
            <>
              <p>
                It has been there since <Time at={Number(refusal.members.since)} mode="minute" />.
              </p>
              <Checkbox
                label="It is here with me now: end that session"
                checked={takeOver}
                onChange={(event) => setTakeOver(event.target.checked)}
                className="mt-2 min-h-11"
              />
            </>
          ) : null}
        </Notice>
      ) : null}
      <div>
        <Button
          type="submit"
          variant="primary"
          size="large"
          busy={busy}
          disabled={!patient || device.trim() === '' || (elsewhere && !takeOver)}
        >
          {patient ? `Open the session for ${nameOf(patient)}` : 'Open the session'}
        </Button>
      </div>
    </form>
  );
}
