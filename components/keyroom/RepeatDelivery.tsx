'use client';

import { useRouter } from 'next/navigation';
import { useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { tell } from '@/components/ui/Toast';

/** Send a delivery again that was set aside. */
export function RepeatDelivery({ id, type }: { id: string; type: string }) {
  const router = useRouter();
  const { act, busy, failure } = useAct(`/api/webhooks/deliveries/${id}/repeat`);
  return (
    <>
      <Button
        size="small"
        busy={busy}
        aria-label={`Send ${type} again`}
        onClick={async () => {
          if (!(await act({}))) return;
          tell('It is on its way again');
          router.refresh();
        }}
      >
        Send again
      </Button>
      {failure ? <span role="alert"> {failure.message}</span> : null}
    </>
  );
}
