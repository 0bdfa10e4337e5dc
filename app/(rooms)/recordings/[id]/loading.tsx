import { Skeleton } from '@/components/ui/Skeleton';

/** The shape of the page: stage at the left, facts at the right. */
export default function Loading() {
  return (
    <div role="status" aria-label="Loading the recording" className="grid gap-5">
      <Skeleton className="h-8 w-80 max-w-full" />
      <Skeleton className="h-5 w-[32rem] max-w-full" />
      <div className="grid gap-6 plate:grid-cols-[minmax(0,1fr)_316px]">
        <Skeleton className="h-96 w-full" />
        <Skeleton className="h-96 w-full" />
      </div>
    </div>
  );
}
