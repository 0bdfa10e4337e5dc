import type { Metadata } from 'next';
import { SigningKeys } from '@/components/credentials/SigningKeys';
import { PageHead } from '@/components/ui/PageHead';
import { requirePage } from '@/lib/http/page';
import { readSigningKeys } from '@/lib/keys/readSigningKeys';

export const metadata: Metadata = { title: 'Signing keys' };

/** The service's own keys and their overlap. */
export default async function SigningKeysPage() {
  const { person, services } = await requirePage('credential.read');
  const rows = await readSigningKeys(services, person);
  return (
    <>
      <PageHead title="Signing keys">
        Public halves at <span className="mono">/.well-known/jwks.json</span>. A superseded key verifies until
        nothing needs it.
      </PageHead>
      <SigningKeys first={{ rows }} />
    </>
  );
}
