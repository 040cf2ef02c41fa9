import { EmptyState } from '../../widgets/states.tsx';
import { en } from '../../texts/en.ts';

/** Measure: not built yet; says so. */
export default function Measure() {
  return <EmptyState title={en.aims.measure}>This place is not built yet.</EmptyState>;
}
