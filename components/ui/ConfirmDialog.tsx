'use client';

import { type FormEvent, type ReactNode, useEffect, useId, useState } from 'react';
import { Button } from './Button';
import { Dialog } from './Dialog';
import { Field, Textarea, TextInput } from './Field';
import { Notice } from './Notice';

export interface ConfirmDialogProps {
  open: boolean;
  onOpenChange: (open: boolean) => void;
  /** Names the thing: "Revoke the credential of HM-0344". */
  title: string;
  /** What will happen, and what will not. */
  children: ReactNode;
  /** Says what it does: "Revoke the credential". */
  confirmLabel: string;
  danger?: boolean;
  /** The act waits until exactly this was typed. */
  typed?: { text: string; label?: string };
  /** The act waits for a reason of at least `minimumLength` characters (default 5). */
  reason?: { label: string; help?: string; minimumLength?: number };
  /** Resolves when done, which closes the dialog. A rejection keeps it open and shows its message. */
  onConfirm: (answer: { reason: string }) => Promise<void>;
}

/** Before something that cannot be taken back: the thing is named, and is typed or given a reason. */
export function ConfirmDialog({ open, onOpenChange, title, children, ...rest }: ConfirmDialogProps) {
  const { confirmLabel, danger = true, typed, reason } = rest;
  const form = useConfirmation(open, onOpenChange, rest);
  const formId = useId();
  return (
    <Dialog
      open={open}
      onOpenChange={form.busy ? () => undefined : onOpenChange}
      title={title}
      footer={
        <>
          <Button onClick={() => onOpenChange(false)} disabled={form.busy}>
            Leave it as it is
          </Button>
          <Button
            type="submit"
            form={formId}
            variant={danger ? 'danger' : 'primary'}
            disabled={!form.ready}
            busy={form.busy}
          >
            {confirmLabel}
          </Button>
        </>
      }
    >
      <form id={formId} onSubmit={form.submit} className="grid gap-4">
        <div className="grid gap-2">{children}</div>
        {form.failure ? <Notice tone="alarm">{form.failure}</Notice> : null}
        <Proof typed={typed} reason={reason} form={form} />
      </form>
    </Dialog>
  );
}

type ProofProps = Pick<ConfirmDialogProps, 'typed' | 'reason'> & { form: ReturnType<typeof useConfirmation> };

function Proof({ typed, reason, form }: ProofProps) {
  return (
    <>
      {typed ? (
        <Field
          label={
            typed.label ?? (
              <>
                Type <span className="mono">{typed.text}</span> to go on
              </>
            )
          }
        >
          <TextInput
            mono
            autoComplete="off"
            spellCheck={false}
            value={form.typedValue}
            onChange={(event) => form.setTypedValue(event.target.value)}
          />
        </Field>
      ) : null}
      {reason ? (
        <Field
          label={reason.label}
          help={reason.help ?? 'It is kept with this change and shown to the auditor.'}
          required
        >
          <Textarea value={form.reasonValue} onChange={(event) => form.setReasonValue(event.target.value)} />
        </Field>
      ) : null}
    </>
  );
}

function useConfirmation(
  open: boolean,
  onOpenChange: (open: boolean) => void,
  { typed, reason, onConfirm }: Pick<ConfirmDialogProps, 'typed' | 'reason' | 'onConfirm'>,
) {
  const [typedValue, setTypedValue] = useState('');
  const [reasonValue, setReasonValue] = useState('');
  const [busy, setBusy] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);
  useEffect(() => {
    if (open) return;
    setTypedValue('');
    setReasonValue('');
    setFailure(null);
  }, [open]);
  const ready =
    (!typed || typedValue.trim() === typed.text) &&
    (!reason || reasonValue.trim().length >= (reason.minimumLength ?? 5));
  const submit = async (event: FormEvent) => {
    event.preventDefault();
    if (!ready || busy) return;
    setBusy(true);
    setFailure(null);
    try {
      await onConfirm({ reason: reasonValue.trim() });
      onOpenChange(false);
    } catch (error) {
      setFailure(error instanceof Error ? error.message : 'It was not done. Try again.');
    } finally {
      setBusy(false);
    }
  };
  return { typedValue, setTypedValue, reasonValue, setReasonValue, busy, failure, ready, submit };
}
