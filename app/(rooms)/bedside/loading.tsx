import { Skeleton } from '@/components/ui/Skeleton';

export default function Loading() {
  return (
    <div role="status" aria-label="Loading" className="grid gap-4">
      <Skeleton className="h-8 w-56" />
      <Skeleton className="h-5 w-96 max-w-full" />
      <Skeleton className="h-11 w-full" />
      <Skeleton className="h-72 w-full" />
    </div>
  );
}
