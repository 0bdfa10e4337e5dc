import { VisuallyHidden } from '@/components/ui/VisuallyHidden';

export interface SparklineProps {
  /** Oldest first; null where nothing was measured: the line has a gap there. */
  values: readonly (number | null)[];
  /** What it shows: "Noise floor, 60 days". */
  label: string;
  unit: string;
  /** Drawn as a dotted line. */
  limit?: number;
  /** The line is drawn in rust: a signal, which the row must also say in words. */
  alarm?: boolean;
  width?: number;
  height?: number;
  digits?: number;
}

/** A line without axes for a table row. Screen readers get first, last, lowest and highest in words. */
export function Sparkline({
  values,
  label,
  unit,
  limit,
  alarm = false,
  width = 88,
  height = 20,
  digits = 1,
}: SparklineProps) {
  const known = values.filter((value) => value !== null);
  if (known.length === 0) return <span className="text-ink-soft">no clips yet</span>;
  const span = limit === undefined ? known : [...known, limit];
  const low = Math.min(...span);
  const high = Math.max(...span);
  const inWords = (value: number | undefined) => `${(value ?? 0).toFixed(digits).replace('-', '−')} ${unit}`;
  const y = (value: number) =>
    high === low ? height / 2 : 2 + ((high - value) / (high - low)) * (height - 4);
  const summary = `${label}: ${known.length} values, first ${inWords(known[0])}, last ${inWords(known.at(-1))}, lowest ${inWords(Math.min(...known))}, highest ${inWords(Math.max(...known))}`;
  return (
    <span className="inline-block align-middle">
      <svg
        aria-hidden="true"
        width={width}
        height={height}
        viewBox={`0 0 ${width} ${height}`}
        className="block"
      >
        {limit === undefined ? null : (
          <path
            d={`M0 ${y(limit).toFixed(1)}H${width}`}
            className="stroke-line-strong"
            strokeDasharray="2 3"
          />
        )}
        <path
          d={lineThrough(values, (index) => (index / Math.max(1, values.length - 1)) * width, y)}
          fill="none"
          strokeWidth="1.4"
          strokeLinejoin="round"
          className={alarm ? 'stroke-rust' : 'stroke-ink-soft'}
        />
      </svg>
      <VisuallyHidden>{summary}</VisuallyHidden>
    </span>
  );
}

/** SVG path through the values, broken where one is missing. */
export function lineThrough(
  values: readonly (number | null)[],
  x: (index: number) => number,
  y: (value: number) => number,
): string {
  let path = '';
  let pen = false;
  values.forEach((value, index) => {
    if (value === null) {
      pen = false;
      return;
    }
    path += `${pen ? 'L' : 'M'}${x(index).toFixed(1)} ${y(value).toFixed(1)}`;
    pen = true;
  });
  return path;
}
