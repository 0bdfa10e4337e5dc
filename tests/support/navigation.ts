/** The parts of next/navigation that drawn components ask for, where a page is drawn without the framework. */
export const useRouter = () => ({ push() {}, replace() {}, refresh() {}, prefetch() {}, back() {} });
export const usePathname = () => '/';
export const useSearchParams = () => new URLSearchParams();
export const notFound = () => {
  throw new Error('not found');
};
