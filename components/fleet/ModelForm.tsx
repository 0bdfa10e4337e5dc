'use client';

import { useRouter } from 'next/navigation';
import type { FormEvent } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Checkbox, FieldSet } from '@/components/ui/Checkbox';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';

const TYPES = [
  ['audio/wav', 'WAV'],
  ['audio/flac', 'FLAC'],
  ['audio/ogg', 'Ogg'],
  ['audio/mpeg', 'MP3'],
] as const;
const numbers = (text: string): number[] =>
  text
    .split(/[\s,;]+/)
    .filter(Boolean)
    .map(Number);

/** A maker's model and what its recordings should be. */
export function ModelForm() {
  const router = useRouter();
  const { act, busy, failure } = useAct<{ id: string }>('/api/models');
  const errors = fieldErrors(failure);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const element = event.currentTarget;
    const form = new FormData(element);
    const value = (name: string) => String(form.get(name) ?? '').trim();
    const answer = await act({
      maker: value('maker'),
      name: value('name'),
      sampleRatesHz: numbers(value('sampleRatesHz')),
      bitDepths: numbers(value('bitDepths')),
      mediaTypes: form.getAll('mediaTypes').map(String),
      allowLossy: form.has('allowLossy'),
      longestClipSeconds: Number(value('longestClipSeconds')),
      fullScaleNote: value('fullScaleNote') || null,
      checkIntervalDays: Number(value('checkIntervalDays')),
      signsRequests: form.has('signsRequests'),
    });
    if (!answer) return;
    tell(`${value('name')} is described`);
    element.reset();
    router.refresh();
  }
  return (
    <form onSubmit={submit} className="grid max-w-[640px] gap-4">
      {failure ? (
        <Notice tone="alarm" title={failure.title}>
          {failure.message}
          {Object.entries(errors).map(([path, message]) => (
            <div key={path}>
              {path}: {message}
            </div>
          ))}
        </Notice>
      ) : null}
      <Field label="Maker" required>
        <TextInput name="maker" maxLength={80} />
      </Field>
      <Field label="Model" required>
        <TextInput name="name" maxLength={80} />
      </Field>
      <Field label="Sample rates, Hz" help="One or several, such as 4000 8000. Empty: any." optional>
        <TextInput name="sampleRatesHz" mono inputMode="numeric" pattern="[0-9 ,;]*" />
      </Field>
      <Field label="Bit depths" optional>
        <TextInput name="bitDepths" mono inputMode="numeric" pattern="[0-9 ,;]*" />
      </Field>
      <FieldSet legend="What it sends">
        <div className="flex flex-wrap gap-x-6 gap-y-2">
          {TYPES.map(([value, label]) => (
            <Checkbox
              key={value}
              name="mediaTypes"
              value={value}
              label={label}
              defaultChecked={value === 'audio/wav'}
            />
          ))}
        </div>
      </FieldSet>
      <Checkbox name="allowLossy" label="A lossy codec is all right for it" />
      <Field label="Longest clip, seconds" required>
        <TextInput name="longestClipSeconds" type="number" min={1} max={86400} defaultValue={120} />
      </Field>
      <Field label="Acoustic check every, days" required>
        <TextInput name="checkIntervalDays" type="number" min={1} max={3650} defaultValue={180} />
      </Field>
      <Field label="At full scale it" help="How it behaves when it is too loud, in words." optional>
        <TextInput name="fullScaleNote" maxLength={400} />
      </Field>
      <Checkbox
        name="signsRequests"
        defaultChecked
        label="It signs its requests with a key of its own"
        help="Without, its credential is a plain bearer token: weaker, shorter-lived, and marked so everywhere."
      />
      <div>
        <Button type="submit" variant="primary" busy={busy}>
          Describe the model
        </Button>
      </div>
    </form>
  );
}
