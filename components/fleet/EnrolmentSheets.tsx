'use client';

import QRCode from 'qrcode';
import { useState } from 'react';
import { ProblemError, sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';

interface ToEnrol {
  id: string;
  assetTag: string;
  serialNumber: string;
  model: string;
  ward: string | null;
  again: boolean;
  ended: boolean;
}
interface Sheet extends ToEnrol {
  code: string;
  expiresAt: number;
  qr: string;
}

/** What a device's scanner reads: the service's address and the code. */
const payloadOf = (origin: string, serialNumber: string, code: string): string =>
  `${origin}/api/device/v1/enrol?serial=${encodeURIComponent(serialNumber)}#${code}`;

/** Makes the codes and shows them once, as sheets that can be printed. */
export function EnrolmentSheets({
  devices,
  origin,
  hospital,
}: {
  devices: ToEnrol[];
  origin: string;
  hospital: string;
}) {
  const [sheets, setSheets] = useState<Sheet[]>([]);
  const [busy, setBusy] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);
  const open = devices.filter((device) => !device.ended);
  async function make() {
    setBusy(true);
    setFailure(null);
    try {
      const made: Sheet[] = [];
      for (const device of open) {
        const { code, expiresAt } = await sendJson<{ code: string; expiresAt: number }>(
          `/api/devices/${device.id}/code`,
          {},
          crypto.randomUUID(),
        );
        const qr = await QRCode.toDataURL(payloadOf(origin, device.serialNumber, code), {
          errorCorrectionLevel: 'M',
          margin: 2,
          width: 240,
        });
        made.push({ ...device, code, expiresAt, qr });
        setSheets([...made]);
      }
    } catch (error) {
      setFailure(
        error instanceof ProblemError
          ? error.message
          : 'The server did not answer. Codes that are shown below are valid.',
      );
    } finally {
      setBusy(false);
    }
  }
  return (
    <div className="grid gap-6">
      <div className="no-print grid gap-4">
        {open.some((device) => device.again) ? (
          <Notice tone="care" title="Enrolled already">
            When a device enrols again, its earlier credentials end at once.
          </Notice>
        ) : null}
        {open.length === 0 ? (
          <Notice tone="alarm" title="Not possible">
            A retired or lost device does not enrol.
          </Notice>
        ) : null}
        {failure ? (
          <Notice tone="alarm" title="Not all codes were made">
            {failure}
          </Notice>
        ) : null}
        <div className="flex flex-wrap gap-3">
          <Button variant="primary" onClick={make} busy={busy} disabled={open.length === 0}>
            {sheets.length === 0
              ? open.length === 1
                ? 'Make the code'
                : `Make ${open.length} codes`
              : 'Make new codes'}
          </Button>
          {sheets.length > 0 ? <Button onClick={() => window.print()}>Print</Button> : null}
        </div>
        {sheets.length === 0 ? (
          <p className="max-w-line text-ink-soft">
            The code is shown here once and kept nowhere. Print the sheet, or read the code out to whoever
            holds the device.
          </p>
        ) : null}
      </div>
      {sheets.map((sheet) => (
        <article
          key={sheet.id}
          className="keep-together grid max-w-[720px] gap-4 rounded-plate border border-line-strong bg-sheet p-6 min-[641px]:grid-cols-[minmax(0,1fr)_240px]"
        >
          <div className="grid content-start gap-4">
            <p className="text-13 text-ink-soft">{hospital} · Bellkeep enrolment</p>
            <h2 className="font-plate text-28! font-semibold!">{sheet.assetTag}</h2>
            <DefinitionList
              facts={[
                { term: 'Serial', value: <span className="mono">{sheet.serialNumber}</span> },
                { term: 'Model', value: sheet.model },
                { term: 'Ward', value: sheet.ward ?? 'none' },
                { term: 'Address', value: <span className="mono break-all">{origin}</span> },
                { term: 'Valid until', value: <Time at={sheet.expiresAt} mode="minute" withZone /> },
              ]}
            />
            <p className="mono text-28 tracking-[0.08em]" data-code={sheet.code}>
              {sheet.code.slice(0, 5)} {sheet.code.slice(5)}
            </p>
            <p className="text-13 text-ink-soft">
              Works once. Five wrong tries end it. It holds no 0, O, 1, I, L or U.
            </p>
          </div>
          {/* biome-ignore lint/performance/noImgElement: made in this browser, there is nothing to optimise */}
          <img
            src={sheet.qr}
            width={240}
            height={240}
            alt={`Code of ${sheet.assetTag} to be scanned`}
            className="bg-white"
          />
        </article>
      ))}
    </div>
  );
}
