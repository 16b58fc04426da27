#ifndef TG_VERSION_H
#define TG_VERSION_H

#define TG_PROGRAM "tomogauge"
#define TG_VERSION "0.1.0"

#endif
