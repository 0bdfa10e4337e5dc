import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { EnrolmentSheets } from '@/components/fleet/EnrolmentSheets';
import { PageHead } from '@/components/ui/PageHead';
import { readDevices } from '@/lib/fleet/readDevice';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Enrolment sheet' };

type Props = { params: Promise<{ id: string }>; searchParams: Promise<{ also?: string | string[] }> };

/** Sheets with a one-time code for one device or several. The codes are made on a press and shown once. */
export default async function SheetPage({ params, searchParams }: Props) {
  const { person, services } = await requirePage('fleet.write');
  const ids = [(await params).id, ...([(await searchParams).also].flat()[0] ?? '').split(',')]
    .filter(Boolean)
    .slice(0, 50);
  const rows = await readDevices(services, person, ids);
  if (rows.length === 0) notFound();
  return (
    <>
      <div className="no-print">
        <PageHead
          title={
            rows.length === 1
              ? `Enrolment sheet of ${rows[0]?.device.assetTag}`
              : `${rows.length} enrolment sheets`
          }
          back={<Link href={`/devices/${rows[0]?.device.id}`}>{rows[0]?.device.assetTag}</Link>}
        >
          Each code works once, for 24 hours and five tries. Making a new one ends the one before.
        </PageHead>
      </div>
      <EnrolmentSheets
        origin={services.env.BELLKEEP_ORIGIN}
        hospital={services.env.BELLKEEP_HOSPITAL}
        devices={rows.map(({ device, model, ward }) => ({
          id: device.id,
          assetTag: device.assetTag,
          serialNumber: device.serialNumber,
          model,
          ward,
          again: device.keyThumbprint !== null,
          ended: device.state === 'retired' || device.state === 'lost',
        }))}
      />
    </>
  );
}
