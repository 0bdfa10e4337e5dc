import type { Metadata } from 'next';
import Link from 'next/link';
import { AddDeviceForm } from '@/components/fleet/AddDeviceForm';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { fleetChoices } from '@/lib/fleet/readFleet';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Add a device' };

export default async function AddDevicePage() {
  const { services } = await requirePage('fleet.write');
  const { person } = await requirePage('fleet.read');
  const { models, wards } = await fleetChoices(services, person);
  return (
    <>
      <PageHead title="Add a device" back={<Link href="/bench">Fleet</Link>}>
        It waits on the list until it enrols itself with the code of its sheet, within 24 hours.
      </PageHead>
      {models.length === 0 ? (
        <EmptyState title="No device model is described yet">
          A device is of a model. <Link href="/bench/models">Describe the model</Link> first: its sample
          rates, media types and check interval.
        </EmptyState>
      ) : (
        <AddDeviceForm models={models} wards={wards} />
      )}
    </>
  );
}
