/** In a map's place while there is none. */
export const MapMessage = ({ className, problem, waiting }: { className: string; problem: string; waiting: string }) => (
  <div className={`grid place-items-center bg-linen-raised p-6 ${className}`}>
    {problem === '' ? (
      <p role="status" className="font-mono text-sm text-ink-soft">{waiting} …</p>
    ) : (
      <div role="alert" className="max-w-prose border-l-4 border-madder bg-madder-wash p-4 text-ink">
        <p className="font-mono text-sm font-semibold">The map cannot be drawn</p>
        <p className="mt-1 font-prose">{problem}</p>
      </div>
    )}
  </div>
);
