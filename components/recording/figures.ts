/** Figures for people: a true minus sign, thin groups, and a word where there is no figure. */
export const figure = (value: number, digits = 0): string => {
  const [whole = '', part] = Math.abs(value).toFixed(digits).split('.');
  const grouped = whole.replace(/\B(?=(\d{3})+$)/g, ',');
  const sign = value < 0 && Number(value.toFixed(digits)) !== 0 ? '−' : '';
  return `${sign}${grouped}${part ? `.${part}` : ''}`;
};

/** "0.03 %" of a fraction. */
export const percentage = (fraction: number): string => {
  const percent = fraction * 100;
  const digits = percent === 0 || percent >= 10 ? 0 : percent >= 1 ? 1 : percent >= 0.01 ? 2 : 4;
  return `${figure(percent, digits)} %`;
};

/** A value with its unit as findings carry it: fractions become percent, dB and Hz are rounded to what is meant. */
export function valueInWords(value: number | undefined, unit: string | undefined): string {
  if (value === undefined) return '';
  switch (unit) {
    case 'fraction':
      return percentage(value);
    case 'Hz':
      return `${figure(value)} Hz`;
    case 's':
      return `${figure(value, 2)} s`;
    case undefined:
    case '':
    case 'count':
      return figure(value, Number.isInteger(value) ? 0 : 2);
    default:
      return `${figure(value, 1)} ${unit}`;
  }
}
