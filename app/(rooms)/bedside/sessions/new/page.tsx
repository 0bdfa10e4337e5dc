import type { Metadata } from 'next';
import { NewSession } from '@/components/bedside/NewSession';
import { PageHead } from '@/components/ui/PageHead';
import { EncounterFilter, listEncounters } from '@/lib/filing/readEncounters';
import { pickDevices } from '@/lib/fleet/pickDevices';
import { requirePage } from '@/lib/http/page';
import { reachEncounter } from '@/lib/http/reach';

export const metadata: Metadata = { title: 'Open a listening session' };

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
    listEncounters(services, bedside.person, EncounterFilter.parse({ limit: 100 })),
    pickDevices(services, person, ''),
  ]);
  const encounters =
    chosen && !page.rows.some((row) => row.id === chosen.id) ? [chosen, ...page.rows] : page.rows;
  return (
    <>
      <PageHead title="Open a listening session">
        From the moment it is open, every clip that this stethoscope records is filed to this patient’s
        encounter.
      </PageHead>
      <NewSession
        encounters={encounters.map(
          ({ id: encounterId, number, givenName, familyName, birthDate, recordNumber, ward, bed }) => ({
            id: encounterId,
            number,
            givenName,
            familyName,
            birthDate,
            recordNumber,
            ward,
            bed,
          }),
        )}
        chosen={chosen?.id ?? null}
        devices={devices}
      />
    </>
  );
}
