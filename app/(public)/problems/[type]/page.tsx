import type { Metadata } from 'next';
import Link from 'next/link';
import { notFound } from 'next/navigation';
import { DefinitionList } from '@/components/ui/DefinitionList';
import { PROBLEMS, type ProblemCode, type ProblemKind } from '@/lib/contract/problems';

type Props = { params: Promise<{ type: string }> };

const find = (type: string): ProblemKind | null =>
  Object.hasOwn(PROBLEMS, type) ? PROBLEMS[type as ProblemCode] : null;

export async function generateMetadata({ params }: Props): Promise<Metadata> {
  const { type } = await params;
  return { title: find(type)?.title ?? 'Not found' };
}

/** What a problem's `type` address leads to (RFC 9457, 3.1.1). */
export default async function ProblemPage({ params }: Props) {
  const { type } = await params;
  const kind = find(type);
  if (!kind) notFound();
  return (
    <>
      <h1>{kind.title}</h1>
      <p className="mt-2 mb-6 font-mono text-ink-soft">{type}</p>
      <DefinitionList
        facts={[
          { term: 'HTTP status', value: kind.status },
          { term: 'What was kept', value: kind.keeps },
          { term: 'Next step', value: kind.next },
        ]}
      />
      <p className="mt-6">
        <Link href="/problems" className="link">
          All problems
        </Link>
      </p>
    </>
  );
}
