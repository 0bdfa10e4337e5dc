'use client';

import { Button } from '@/components/ui/Button';
import { CopyText } from '@/components/ui/CopyText';
import { Dialog } from '@/components/ui/Dialog';
import { Notice } from '@/components/ui/Notice';

/** A secret at the one moment when it can be copied. */
export function ShownOnce({
  title,
  parts,
  onClose,
}: {
  title: string;
  /** What it is, and the text; null where a repeated press was answered, which never holds the secret. */
  parts: readonly { label: string; what: string; text: string | null }[] | null;
  onClose: () => void;
}) {
  return (
    <Dialog
      open={parts !== null}
      onOpenChange={(open) => (open ? undefined : onClose())}
      title={title}
      footer={
        <Button variant="primary" onClick={onClose}>
          I have kept it
        </Button>
      }
    >
      <div className="grid gap-4">
        <Notice tone="care" title="Shown once">
          Copy the secret now, into the other system. It is kept here as a hash or sealed, and cannot be shown
          again.
        </Notice>
        {(parts ?? []).map(({ label, what, text }) => (
          <div key={label} className="grid gap-0.5">
            <span className="text-13 text-ink-soft">{label}</span>
            {text === null ? (
              'It was shown before. Rotate it to get another.'
            ) : (
              <CopyText text={text} what={what} />
            )}
          </div>
        ))}
      </div>
    </Dialog>
  );
}
