/** One measured figure. `ok` is null where no target is set. */
export interface Figure {
  name: string;
  value: number;
  unit: string;
  target: number | null;
  ok: boolean | null;
}
