import type { Metadata } from 'next';
import Link from 'next/link';
import { OperationPart } from '@/components/deviceApi/OperationPart';
import { Steps } from '@/components/deviceApi/Steps';
import { Walkthrough } from '@/components/deviceApi/Walkthrough';
import { Section } from '@/components/ui/Panel';
import { deviceApiDocument } from '@/lib/contract/openapi';
import { DEVICE_OPERATIONS } from '@/lib/contract/operations';
import { walkthrough } from '@/lib/contract/walkthrough';
import { getServices } from '@/lib/http/services';

export const metadata: Metadata = { title: 'Device API' };

/** For device makers: what a device does, every call, and a walk-through; all made of what the routes are made of. */
export default async function DeviceApiPage() {
  const { env } = await getServices();
  const document = deviceApiDocument(env.BELLKEEP_ORIGIN);
  return (
    <div data-wide-page className="grid gap-10">
      <header>
        <h1>Device API</h1>
        <p className="mt-2 max-w-line text-17 text-ink-soft">
          How an electronic stethoscope hands over its recordings. The same is an{' '}
          <a href="/api/device/v1/openapi.json" className="link">
            OpenAPI 3.1 document
          </a>
          , and every refusal has{' '}
          <Link href="/problems" className="link">
            a page of its own
          </Link>
          .
        </p>
        <nav aria-label="On this page" className="mt-4">
          <ul className="flex flex-wrap gap-x-5 gap-y-1">
            {[
              ['steps', 'Step by step'],
              ['walkthrough', 'Walk-through'],
              ...DEVICE_OPERATIONS.map(({ id, path }) => [id, path.replace('/api/device/v1', '')]),
            ].map(([id, words]) => (
              <li key={id}>
                <a href={`#${id}`} className="link">
                  {words}
                </a>
              </li>
            ))}
          </ul>
        </nav>
      </header>
      <Section title={<span id="steps">Step by step</span>}>
        <Steps />
      </Section>
      <Section title={<span id="walkthrough">Walk-through with curl and openssl</span>}>
        <Walkthrough steps={walkthrough(env.BELLKEEP_ORIGIN)} />
      </Section>
      {DEVICE_OPERATIONS.map((operation) => (
        <OperationPart key={operation.id} document={document} path={operation.path} />
      ))}
    </div>
  );
}
