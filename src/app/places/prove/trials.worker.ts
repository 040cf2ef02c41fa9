/** One worker of the trials' pool. */
import { serveTrials, type TaskMessage } from '../../../trials/protocol.ts';

serveTrials({
  post: (answer) => self.postMessage(answer),
  listen: (hear) => {
    self.onmessage = ({ data }: MessageEvent<TaskMessage>) => hear(data);
  },
});
