'use client';

import { useRouter } from 'next/navigation';
import type { FormEvent } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { ErrorSummary } from '@/components/ui/ErrorSummary';
import { Field, Select, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';

type Choice = { id: string; name: string };

/** Put one device on the list; the next page is its enrolment sheet. */
export function AddDeviceForm({ models, wards }: { models: Choice[]; wards: Choice[] }) {
  const router = useRouter();
  const { act, busy, failure } = useAct<{ id: string }>('/api/devices');
  const errors = fieldErrors(failure);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const value = (name: string) => String(form.get(name) ?? '').trim();
    const optional = (name: string) => value(name) || null;
    const answer = await act({
      assetTag: value('assetTag').toUpperCase(),
      serialNumber: value('serialNumber'),
      modelId: value('modelId'),
      wardId: optional('wardId'),
      udi: optional('udi'),
      lot: optional('lot'),
      firmware: optional('firmware'),
    });
    if (answer) router.push(`/devices/${answer.id}/sheet`);
  }
  const field = (name: string, label: string, help: string | undefined, required: boolean) => (
    <Field
      id={name}
      label={label}
      help={help}
      error={errors[name]}
      {...(required ? { required } : { optional: true })}
    >
      <TextInput name={name} mono autoComplete="off" maxLength={200} />
    </Field>
  );
  return (
    <form onSubmit={submit} className="grid max-w-[640px] gap-4">
      {failure && Object.keys(errors).length === 0 ? (
        <Notice tone="alarm" title={failure.title}>
          {failure.message}
        </Notice>
      ) : null}
      <ErrorSummary errors={Object.entries(errors).map(([id, message]) => ({ id, message }))} />
      {field('assetTag', 'Asset tag', 'As on the hospital’s label, such as HM-0512.', true)}
      {field(
        'serialNumber',
        'Serial number',
        'As the maker engraved it. The device sends the same when it enrols.',
        true,
      )}
      <Field id="modelId" label="Model" error={errors.modelId} required>
        <Select
          name="modelId"
          placeholder="Choose a model"
          options={models.map(({ id, name }) => ({ value: id, label: name }))}
        />
      </Field>
      <Field id="wardId" label="Ward" error={errors.wardId} optional>
        <Select
          name="wardId"
          placeholder="None yet"
          options={wards.map(({ id, name }) => ({ value: id, label: name }))}
        />
      </Field>
      {field('udi', 'UDI', 'Scan the label; the whole string is kept.', false)}
      {field('lot', 'Lot', undefined, false)}
      {field('firmware', 'Firmware', undefined, false)}
      <div>
        <Button type="submit" variant="primary" busy={busy}>
          Add the device and make its sheet
        </Button>
      </div>
    </form>
  );
}
