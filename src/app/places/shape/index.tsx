import { EmptyState } from '../../widgets/states.tsx';
import { en } from '../../texts/en.ts';

/** Shape: not built yet; says so. */
export default function Shape() {
  return <EmptyState title={en.aims.shape}>This place is not built yet.</EmptyState>;
}
