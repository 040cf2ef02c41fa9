import { EmptyState } from '../../widgets/states.tsx';
import { en } from '../../texts/en.ts';

/** Match: not built yet; says so. */
export default function Match() {
  return <EmptyState title={en.aims.match}>This place is not built yet.</EmptyState>;
}
