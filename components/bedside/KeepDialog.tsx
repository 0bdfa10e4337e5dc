'use client';

import { sendJson } from '@/components/shell/useData';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';

interface Props {
  /** The recording's number. */
  number: string;
  open: boolean;
  onOpenChange: (open: boolean) => void;
  onKept: () => void;
}

/** Keep a clip that should be recorded again: with a reason, and the verdict stays. */
export function KeepDialog({ number, open, onOpenChange, onKept }: Props) {
  return (
    <ConfirmDialog
      open={open}
      onOpenChange={onOpenChange}
      title={`Keep ${number} anyway`}
      confirmLabel="Keep the clip"
      danger={false}
      reason={{ label: 'Why it is kept', help: 'For example: the child would not allow a second try.' }}
      onConfirm={async ({ reason }) => {
        await sendJson(`/api/recordings/${number}/keep`, { reason }, crypto.randomUUID());
        onKept();
      }}
    >
      The verdict stays “record again”. The site counts as done, and your reason stands in the custody thread.
    </ConfirmDialog>
  );
}
