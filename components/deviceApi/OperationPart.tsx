import Link from 'next/link';
import type { ReactNode } from 'react';
import { DataTable } from '@/components/ui/DataTable';
import { EmptyState } from '@/components/ui/EmptyState';
import { Section } from '@/components/ui/Panel';
import { type ColumnOf, tableOf } from '@/components/ui/tableRows';
import { type Member, membersOf } from '@/lib/contract/describeSchema';
import type { ApiDocument } from '@/lib/contract/openapi';

interface Content {
  [mediaType: string]: { schema?: unknown; examples?: Record<string, unknown> } | undefined;
}
interface Answer {
  description?: string;
  content?: Content;
}

const MEMBERS: ColumnOf<Member>[] = [
  {
    id: 'name',
    header: 'Member',
    cell: ({ name, required }) => (
      <>
        <span className="mono">{name}</span>
        {required ? null : <span className="text-13 text-ink-soft"> optional</span>}
      </>
    ),
  },
  { id: 'type', header: 'Type', wrap: true, maxWidth: '28ch', cell: ({ type }) => type },
  { id: 'description', header: 'Meaning', wrap: true, cell: ({ description }) => description },
];

function Members({ caption, members }: { caption: string; members: Member[] }) {
  if (members.length === 0) return <p className="text-ink-soft">An empty object.</p>;
  const table = tableOf(members, MEMBERS, { id: (m) => m.name, label: (m) => m.name });
  return <DataTable caption={caption} {...table} empty={<EmptyState title="None" />} />;
}

function Part({ title, children }: { title: string; children: ReactNode }) {
  return (
    <div className="grid gap-2">
      <h3 className="font-semibold">{title}</h3>
      {children}
    </div>
  );
}

/** One call: its body, its answers, its problems; read out of the OpenAPI document. */
export function OperationPart({ document, path }: { document: ApiDocument; path: string }) {
  const operation = document.paths?.[path]?.post;
  if (!operation) return null;
  const id = operation.operationId ?? path;
  const body = (operation.requestBody as { content?: Content } | undefined)?.content?.['application/json'];
  const answers = Object.entries(operation.responses ?? {}) as [string, Answer][];
  const good = answers.filter(([status]) => status.startsWith('2'));
  const refused = answers.filter(([status]) => !status.startsWith('2'));
  const schema = good[0]?.[1].content?.['application/json']?.schema;
  return (
    <Section
      title={
        <span id={id} className="break-all">
          <span className="mono">POST {path}</span>
        </span>
      }
    >
      <div className="grid gap-6">
        <p className="max-w-line">
          <b>{operation.summary}.</b> {operation.description}
        </p>
        <Part title="What is sent">
          <Members caption={`Members sent to ${path}`} members={membersOf(document, body?.schema)} />
        </Part>
        <Part title="What is answered">
          <ul className="grid gap-1">
            {good.map(([status, { description }]) => (
              <li key={status}>
                <span className="mono">{status}</span> {description}
              </li>
            ))}
          </ul>
          <Members caption={`Members answered by ${path}`} members={membersOf(document, schema)} />
        </Part>
        <Part title="Problems">
          <ul className="grid gap-1">
            {refused.map(([status, { content }]) => (
              <li key={status} className="flex flex-wrap items-center gap-x-3 gap-y-1">
                <span className="mono">{status}</span>
                {Object.keys(content?.['application/problem+json']?.examples ?? {}).map((code) => (
                  <Link
                    key={code}
                    href={`/problems/${code}`}
                    className="link mono inline-flex min-h-6 items-center"
                  >
                    {code}
                  </Link>
                ))}
              </li>
            ))}
          </ul>
        </Part>
      </div>
    </Section>
  );
}
