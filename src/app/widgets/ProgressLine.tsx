/** A thin line of the share done; `null` says "at work, share unknown". */
export function ProgressLine(props: { share: number | null; label: string }) {
  const percent = props.share === null ? null : Math.floor(props.share * 100);
  return (
    <div
      class={percent === null ? 'progress unknown' : 'progress'}
      role="progressbar"
      aria-label={props.label}
      aria-valuemin={0}
      aria-valuemax={100}
      aria-valuenow={percent ?? undefined}
    >
      <div style={{ width: `${percent ?? 100}%` }} />
    </div>
  );
}
