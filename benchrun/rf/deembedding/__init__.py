"""What stands between the calibrated planes and the unit, taken out or put in.

One convention for every two-port here: a chain is read from analyzer port 1 to analyzer port 2, and each
part has its port 1 on the left::

    analyzer   +--------------+   +------+   +--------------+   analyzer
    port 1  ---| 1  left    2 |---| 1  2 |---| 1  right   2 |---  port 2
               +--------------+   | unit |   +--------------+
                                  +------+

So a left half has its port 2 at the unit, a right half its port 1. A half that was saved with its outer
port first on both sides (IEEE 370 numbers them so) is turned round before it is used as the right one.
"""
