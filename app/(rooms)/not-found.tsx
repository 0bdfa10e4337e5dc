import Link from 'next/link';
import { PageHead } from '@/components/ui/PageHead';

/** What does not exist and what one may not see look alike. */
export default function NotFound() {
  return (
    <PageHead title="There is nothing here that you may see">
      The address or the number may be mistyped, or it belongs to a room that you do not enter.{' '}
      <Link href="/">Go to your own room</Link>.
    </PageHead>
  );
}
