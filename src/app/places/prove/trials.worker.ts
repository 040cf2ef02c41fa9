/** One worker of the trials' pool. */
import { answerTask, type TaskMessage } from '../../../trials/pool.ts';

self.onmessage = ({ data }: MessageEvent<TaskMessage>) => self.postMessage(answerTask(data));
