'use client';

import { useEffect, useId, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Dialog } from '@/components/ui/Dialog';
import { Field, Textarea } from '@/components/ui/Field';
import { readHead } from '@/lib/custody/pure/head';

interface Props {
  open: boolean;
  onOpenChange: (open: boolean) => void;
  /** A signed note; its signature is not checked yet. */
  onHeld: (note: string) => void;
}

/** A head out of the auditors' mail, pasted: the log is then held against it. */
export function HeldHeadDialog({ open, onOpenChange, onHeld }: Props) {
  const [text, setText] = useState('');
  const [failure, setFailure] = useState<string>();
  const form = useId();
  useEffect(() => {
    if (!open) setFailure(undefined);
  }, [open]);
  return (
    <Dialog
      open={open}
      onOpenChange={onOpenChange}
      title="Check against a head you hold"
      description="Heads are mailed to the auditors each day. One that you kept shows whether the log is still the one it was then."
      footer={
        <>
          <Button onClick={() => onOpenChange(false)}>Leave it</Button>
          <Button type="submit" form={form} variant="primary">
            Check against it
          </Button>
        </>
      }
    >
      <form
        id={form}
        onSubmit={(event) => {
          event.preventDefault();
          const note = `${text.replace(/\r\n?/g, '\n').trim()}\n`;
          try {
            readHead(note);
          } catch {
            setFailure('That is no whole head. Paste all of it: name, size, root, empty line, signature.');
            return;
          }
          onHeld(note);
          onOpenChange(false);
        }}
      >
        <Field
          label="The head"
          error={failure}
          help="From the line with the log’s name to the line that begins with a dash."
        >
          <Textarea
            className="font-mono text-13"
            rows={7}
            spellCheck={false}
            value={text}
            onChange={(event) => setText(event.target.value)}
          />
        </Field>
      </form>
    </Dialog>
  );
}
