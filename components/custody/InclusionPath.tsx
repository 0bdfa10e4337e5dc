import { sidesOfPath } from '@/lib/custody/pure/proofs';

const short = (hash: string) => `${hash.slice(0, 8)}…${hash.slice(-6)}`;
/** Height of a level, and the width that the path is drawn in. */
const LEVEL = 26;
const WIDTH = 150;
const MIDDLE = WIDTH / 2;
const OUT = 48;

interface Props {
  sequence: number;
  size: number;
  leaf: string;
  path: readonly string[];
}

/** How one entry leads to the root: its own hashes as the trunk, those of the path on their sides. */
export function InclusionPath({ sequence, size, leaf, path }: Props) {
  const sides = sidesOfPath(sequence, size);
  const height = (path.length + 2) * LEVEL;
  const yOf = (level: number) => height - 1.5 * LEVEL - level * LEVEL;
  return (
    <details className="border-t border-line px-[18px] py-3">
      <summary className="cursor-pointer text-13 text-ink-soft">
        How entry {sequence.toLocaleString('en-GB')} leads to the root: {path.length}{' '}
        {path.length === 1 ? 'hash' : 'hashes'}
      </summary>
      <div className="mt-2 grid grid-cols-[auto_minmax(0,1fr)] gap-x-3">
        <svg aria-hidden="true" width={WIDTH} height={height} className="flex-none">
          {path.map((hash, level) => {
            const x = MIDDLE + (sides[level] === 'left' ? -OUT : OUT);
            return (
              <g key={hash} fill="none" strokeWidth="2">
                <path d={`M${x} ${yOf(level)}L${MIDDLE} ${yOf(level + 1)}`} className="stroke-line-strong" />
                <path
                  d={`M${MIDDLE} ${yOf(level)}L${MIDDLE} ${yOf(level + 1)}`}
                  className="stroke-spruce"
                  strokeWidth="3"
                />
                <circle cx={x} cy={yOf(level)} r="5" className="fill-slate" />
                <circle cx={MIDDLE} cy={yOf(level + 1)} r="4" className="fill-spruce" />
              </g>
            );
          })}
          <circle cx={MIDDLE} cy={yOf(0)} r="6" className="fill-brass" />
        </svg>
        <ol className="flex flex-col-reverse font-mono text-13">
          <li className="flex items-center" style={{ height: LEVEL }}>
            entry {sequence.toLocaleString('en-GB')}: {short(leaf)}
          </li>
          {path.map((hash, i) => (
            <li key={hash} className="flex items-center" style={{ height: LEVEL }}>
              {sides[i]} {short(hash)}
            </li>
          ))}
          <li className="flex items-center" style={{ height: LEVEL }}>
            root
          </li>
        </ol>
      </div>
    </details>
  );
}
