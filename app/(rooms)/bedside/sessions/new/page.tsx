import type { Metadata } from 'next';
import Link from 'next/link';
import { NewSession } from '@/components/bedside/NewSession';
import { PageHead } from '@/components/ui/PageHead';
import { EncounterFilter, type EncounterLine, listEncounters } from '@/lib/filing/readEncounters';
import { pickDevices } from '@/lib/fleet/pickDevices';
import { requirePage } from '@/lib/http/page';
import { reachEncounter } from '@/lib/http/reach';

export const metadata: Metadata = { title: 'Open a listening session' };

/** How many are shown before a name is typed: a ward, not a hospital. */
const AT_FIRST = 12;

const choiceOf = (e: EncounterLine) => ({
  id: e.id,
  number: e.number,
  familyName: e.familyName,
  givenName: e.givenName,
  birthDate: e.birthDate,
  recordNumber: e.recordNumber,
  ward: e.ward,
  bed: e.bed,
});

/** Choose the patient and the stethoscope: from then on its clips file themselves. */
export default async function NewSessionPage({
  searchParams,
}: {
  searchParams: Promise<{ encounter?: string | string[] }>;
}) {
  const { person, services } = await requirePage('session.write');
  const bedside = await requirePage('bedside.read');
  const id = [(await searchParams).encounter].flat()[0];
  const [chosen, page, devices] = await Promise.all([
    id ? reachEncounter(services, person, id).catch(() => null) : null,
    listEncounters(services, bedside.person, EncounterFilter.parse({ limit: AT_FIRST })),
    pickDevices(services, person, ''),
  ]);
  return (
    <>
      <PageHead title="Open a listening session" back={<Link href="/bedside">Bedside</Link>}>
        From the moment it is open, every clip that this stethoscope records is filed to this patient’s
        encounter.
      </PageHead>
      <NewSession
        encounters={page.rows.map(choiceOf)}
        chosen={chosen && chosen.status === 'in-progress' ? choiceOf(chosen) : null}
        devices={devices}
      />
    </>
  );
}
