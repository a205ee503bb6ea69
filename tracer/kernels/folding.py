"""The running mean over batches, one pass through the numbers of a batch."""

from tracer.kernels.compiling import kernel


@kernel
def fold_batch(buffer, batches, mean, squared_deviation):
    """Take `buffer` (n,), batch number `batches` from 1, into `mean` (n,) and `squared_deviation` (n,) from it.

    The stable update of Welford 1962, Technometrics 4, 419: the squared deviation never goes negative. A compiled pass,
    since array arithmetic would write and read three more arrays as large as the batch.
    """
    for i in range(mean.shape[0]):
        deviation = buffer[i] - mean[i]
        mean[i] += deviation / batches
        squared_deviation[i] += deviation * (buffer[i] - mean[i])
