import { LonePage } from '@/components/ui/LonePage';

export default function NotFound() {
  return (
    <LonePage title="There is nothing here that you may see">
      <p>Check the address or the number. What does not exist and what is not yours to see answer alike.</p>
      <p>
        <a href="/">Go to your room</a>
      </p>
    </LonePage>
  );
}
