'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useId, useState } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { Dialog } from '@/components/ui/Dialog';
import { Field, Select, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';

interface Choices {
  wards: { id: string; name: string }[];
  models: { id: string; name: string }[];
  firmwares: string[];
}

const ALL = '';
const DAY_MS = 86_400_000;

function selectionOf(form: FormData) {
  const text = (name: string) => {
    const value = form.get(name);
    return typeof value === 'string' && value !== ALL ? value : null;
  };
  const days = text('endingDays');
  return {
    wardId: text('ward'),
    modelId: text('model'),
    firmware: text('firmware'),
    endingBefore: days === null ? null : Date.now() + Number(days) * DAY_MS,
  };
}

/** Start a rotation run: whose credentials, how fast, until when, and why. As it opens it is a run over all. */
export function NewRunButton({ choices }: { choices: Choices }) {
  const [open, setOpen] = useState(false);
  const [hit, setHit] = useState<number | null>(null);
  const formId = useId();
  const router = useRouter();
  const { act, busy, failure } = useAct<{ id: string }>('/api/rotations');
  const errors = fieldErrors(failure);
  const count = async (form: HTMLFormElement | null) => {
    if (!form) return;
    const answer = await sendJson<{ members: number }>(
      '/api/rotations/count',
      selectionOf(new FormData(form)),
      crypto.randomUUID(),
    ).catch(() => null);
    setHit(answer?.members ?? null);
  };
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const answer = await act({
      selection: selectionOf(form),
      waveSize: Number(form.get('waveSize')),
      wavePauseMinutes: Number(form.get('wavePauseMinutes')),
      deadlineHours: Number(form.get('deadlineHours')),
      atDeadline: form.get('atDeadline'),
      reason: form.get('reason'),
    });
    if (answer) router.push(`/keyroom/rotations/${answer.id}`);
  }
  return (
    <>
      <Button variant="primary" onClick={() => setOpen(true)}>
        Start a rotation run
      </Button>
      <Dialog
        open={open}
        onOpenChange={busy ? () => undefined : setOpen}
        title="Start a rotation run"
        description="Each device is told to renew with its next call. Its old credential works until the new one is used, so nothing stops."
        footer={
          <>
            <Button onClick={() => setOpen(false)} disabled={busy}>
              Leave it
            </Button>
            <Button type="submit" form={formId} variant="primary" busy={busy} disabled={hit === 0}>
              {hit === null ? 'Start the run' : `Renew ${hit.toLocaleString('en-GB')}`}
            </Button>
          </>
        }
      >
        <form
          id={formId}
          ref={(form) => {
            if (form && hit === null) void count(form);
          }}
          onSubmit={submit}
          onChange={(event) => {
            if (event.target instanceof HTMLSelectElement) void count(event.currentTarget);
          }}
          className="grid gap-4"
        >
          {failure && Object.keys(errors).length === 0 ? (
            <Notice tone="alarm" title={failure.title}>
              {failure.message}
            </Notice>
          ) : null}
          <div className="grid gap-4 sm:grid-cols-2">
            <Field label="Ward">
              <Select name="ward" options={named('All wards', choices.wards)} />
            </Field>
            <Field label="Model">
              <Select name="model" options={named('All models', choices.models)} />
            </Field>
            <Field label="Firmware">
              <Select
                name="firmware"
                options={named(
                  'All firmware',
                  choices.firmwares.map((version) => ({ id: version, name: version })),
                )}
              />
            </Field>
            <Field label="Ending">
              <Select
                name="endingDays"
                options={[
                  { value: ALL, label: 'At any time' },
                  { value: '14', label: 'Within 14 days' },
                  { value: '30', label: 'Within 30 days' },
                  { value: '90', label: 'Within 90 days' },
                ]}
              />
            </Field>
            <Field label="Devices a wave" error={errors.waveSize}>
              <TextInput name="waveSize" type="number" min={1} max={5000} defaultValue={200} />
            </Field>
            <Field label="Minutes between waves" error={errors.wavePauseMinutes}>
              <TextInput name="wavePauseMinutes" type="number" min={0} max={10_080} defaultValue={5} />
            </Field>
            <Field label="Hours until the deadline" error={errors.deadlineHours}>
              <TextInput name="deadlineHours" type="number" min={1} max={2160} defaultValue={72} />
            </Field>
            <Field label="Who misses it">
              <Select
                name="atDeadline"
                options={[
                  { value: 'keep', label: 'keeps the old credential until its end' },
                  { value: 'revoke', label: 'is revoked and must enrol again' },
                ]}
              />
            </Field>
          </div>
          <Field
            label="Reason"
            help="It stands in the custody log with your name."
            required
            error={errors.reason}
          >
            <Textarea name="reason" rows={2} maxLength={500} />
          </Field>
        </form>
      </Dialog>
    </>
  );
}

const named = (all: string, choices: { id: string; name: string }[]) => [
  { value: ALL, label: all },
  ...choices.map(({ id, name }) => ({ value: id, label: name })),
];
