import { cx } from './cx';

/** Stands where something will be; still to screen readers, which hear the region's `aria-busy`. */
export function Skeleton({ className }: { className?: string }) {
  return (
    <span aria-hidden="true" className={cx('block h-3 animate-breathe rounded-plate bg-line', className)} />
  );
}
