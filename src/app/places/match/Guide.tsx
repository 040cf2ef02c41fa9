import { LOG_GUIDE } from '../../../matching/guide.ts';
import { matchTexts as words } from './texts.ts';

/** What makes a log worth having; the cautions stand first. */
export function Guide() {
  const list = (title: string, lines: readonly string[]) => (
    <>
      <h3>{title}</h3>
      <ul>
        {lines.map((line) => (
          <li key={line}>{line}</li>
        ))}
      </ul>
    </>
  );
  return (
    <section class="match-guide" aria-label={words.guide}>
      <h2>{words.guide}</h2>
      <div class="match-cautions">{list(words.cautions, LOG_GUIDE.cautions)}</div>
      {list(words.beforehand, LOG_GUIDE.before)}
      {list(words.logging, LOG_GUIDE.logging)}
      <table class="table">
        <caption>{words.toFly}</caption>
        <thead>
          <tr>
            <th scope="col">{words.what}</th>
            <th scope="col" class="numeric">
              {words.seconds}
            </th>
            <th scope="col">{words.gives}</th>
          </tr>
        </thead>
        <tbody>
          {LOG_GUIDE.steps.map((step, i) => (
            <tr key={`${step.title} ${i}`}>
              <td>
                <strong>{step.title}.</strong> {step.how}
              </td>
              <td class="numeric">
                {step.seconds} <span class="unit">s</span>
              </td>
              <td>{step.gives}</td>
            </tr>
          ))}
        </tbody>
      </table>
    </section>
  );
}
