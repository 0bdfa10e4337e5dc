import type { Metadata } from 'next';
import Link from 'next/link';
import { HeadsTable } from '@/components/custody/HeadsTable';
import { CopyText } from '@/components/ui/CopyText';
import { PageHead } from '@/components/ui/PageHead';
import { Section } from '@/components/ui/Panel';
import { Time } from '@/components/ui/Time';
import { headKeys } from '@/lib/custody/heads/headKeys';
import { readHeads } from '@/lib/custody/heads/readHeads';
import { logSize } from '@/lib/custody/readThread';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Tree heads' };

const LIMIT = 50;

/** The signed heads of the log, newest first; two of them are compared in the reader's browser. */
export default async function HeadsPage({
  searchParams,
}: {
  searchParams: Promise<{ before?: string | string[] }>;
}) {
  const { services } = await requirePage('ledger.read');
  const wanted = Number((await searchParams).before);
  const before = Number.isSafeInteger(wanted) && wanted > 0 ? wanted : undefined;
  const [page, keys, size] = await Promise.all([
    readHeads(services, { before, limit: LIMIT }),
    headKeys(services),
    logSize(services),
  ]);
  const newest = page.rows[0];
  const origin = services.env.BELLKEEP_CUSTODY_ORIGIN;
  return (
    <>
      <PageHead
        title="Tree heads"
        back={
          <Link className="link" href="/ledger">
            Ledger
          </Link>
        }
      >
        {newest === undefined || before !== undefined ? (
          `The log holds ${size.toLocaleString('en-GB')} entries.`
        ) : (
          <>
            The log holds {size.toLocaleString('en-GB')} entries; the last head was signed over{' '}
            {newest.size.toLocaleString('en-GB')} of them, <Time at={newest.madeAt} mode="second" withZone />.
          </>
        )}{' '}
        A head fixes every entry before it. Choose two to see that the later one holds the earlier one whole.
      </PageHead>
      <HeadsTable
        origin={origin}
        rows={page.rows}
        olderHref={page.next === null ? null : `/ledger/heads?before=${page.next}`}
        newerHref={before === undefined ? null : '/ledger/heads'}
      />
      <Section title="Keys that sign the heads" className="mt-8 max-w-line">
        <p className="mb-2 text-ink-soft">
          Also at <code>/.well-known/custody-keys.txt</code> and in each letter to the auditors. A key that
          you compare with nothing proves nothing.
        </p>
        <ul className="grid gap-2">
          {keys.map((key) => (
            <li key={key.kid}>
              <CopyText text={key.verifier} what="key" />
              <span className="block text-13 text-ink-soft">
                since <Time at={key.createdAt} mode="minute" withZone />
                {key.compromisedAt !== null
                  ? ', compromised: nothing it signed is believed'
                  : key.supersededAt !== null
                    ? ', no longer signs'
                    : ''}
              </span>
            </li>
          ))}
        </ul>
      </Section>
    </>
  );
}
